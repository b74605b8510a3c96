#include "sim/linear/operating_point.hpp"

#include <algorithm>
#include <limits>

#include "sim/linear/flux_rule.hpp"
#include "sim/linear/truth.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {
namespace {

constexpr double two_pi = 6.28318530717958647693, none = std::numeric_limits<double>::quiet_NaN();

double first_of(const Knots& knots) { return knots.empty() ? none : knots.front()[1]; }

bool speed_imposed(const Scenario& s) {
  return std::any_of(s.loads.begin(), s.loads.end(), [](const auto& load) { return load.kind == "imposed_speed"; });
}

// The engine's start, which knows all loads and supplies, at the steady state whatever the scenario starts from.
RunSetup steady_setup(Scenario s) {
  // On mains at an imposed speed there is always a steady state, and no load that decides it.
  s.run.start = s.on_mains() && speed_imposed(s) ? "standstill" : "steady";
  try {
    return prepare_run(s, 0, 0);
  } catch (const InputError& e) {
    if (e.key() != "run.start") throw;
    const std::string lead = "start = \"steady\": ", said = e.message();
    throw InputError(
        s.path, "run.start",
        "no operating point to linearise at: " + (said.starts_with(lead) ? said.substr(lead.size()) : said), "steady");
  }
}

SteadyState on_flux_axis(const SteadyState& s) {
  const Vec2<double> along = (1.0 / magnitude(s.flux.rotor)) * s.flux.rotor;
  SteadyState t = s;
  t.flux = {seen_from(along, s.flux.stator), seen_from(along, s.flux.rotor)};
  t.current = seen_from(along, s.current);
  t.voltage = seen_from(along, s.voltage);
  return t;
}

// Steady state at this speed, whatever the torque: on the mains' voltage at its slip.
SteadyState on_mains(const Circuit<double>& c, const Mains<double>& mains, double frequency_Hz, double speed_rad_s) {
  const double w = two_pi * frequency_Hz;
  return on_flux_axis(steady_at_slip(c, mains.peak, w, 1.0 - c.pole_pairs * speed_rad_s / w));
}

// Angle of the rotor flux at t = 0: along alpha with an inverter; on mains behind the voltage, whose phase is given.
SinCos<double> flux_angle(const Scenario& s, const SteadyState& at) {
  if (!s.on_mains()) return {0.0, 1.0};
  const SinCos<double> voltage = sincos_turns(s.supply.phase_deg / 360.0);
  const Vec2<double> turned = seen_from((1.0 / magnitude(at.voltage)) * at.voltage, {voltage.cos, voltage.sin});
  return {turned.y, turned.x};
}

void write_references(PlantRow& row, const Scenario& s, double flux) {
  row[P::speed_reference_rpm] = first_of(s.reference.speed_rpm);
  row[P::rotor_flux_reference] = s.on_mains() ? none : flux;
}

}  // namespace

OperatingPoint operating_point(const Scenario& s) {
  const Truth truth(steady_setup(s));
  const Circuit<double>& c = truth.circuit;
  OperatingPoint point;
  const double speed = truth.plant.speed(), resisting = truth.plant.load_at_start(speed);
  if (s.on_mains()) {
    point.steady = on_mains(c, truth.setup.plant.drive.mains, s.supply.frequency_Hz, speed);
  } else {
    const MachineFlux<double> start = flux_of(truth.plant.state());
    const Machine<double> m = make_machine(c);
    const double T = torque(m, start, stator_current(m, start));
    point.steady = steady_at_flux(c, FluxRule(s).at(speed, T), T, c.pole_pairs * speed);
  }
  point.machine = linear::point_of(c, point.steady);
  point.machine.inertia_kgm2 = truth.inertia;
  point.machine.damping = truth.damping(speed);
  point.speed_held = truth.setup.shape.plant.speed_imposed;
  point.speed_measured = s.sensors.speed.kind != "none";
  point.load_torque_Nm = resisting;

  const SinCos<double> angle = flux_angle(s, point.steady);
  Plant<double> plant = truth.plant;
  plant.set_state({turn_forward(angle, point.steady.flux.stator), turn_forward(angle, point.steady.flux.rotor)}, speed);
  point.row = plant.row(0);
  const Vec2<double> u = turn_forward(angle, point.steady.voltage);
  point.row[P::u_alpha] = u.x;
  point.row[P::u_beta] = u.y;
  write_references(point.row, s, point.steady.flux.rotor.x);
  return point;
}

Scenario machine_on_mains(const MachineSettings& machine) {
  Scenario s;
  s.path = machine.file;
  s.machine = machine;
  s.run = {1.0, 1e-5, 1e-4, 1e-3, "rk4", "steady", 0.0};
  s.shaft.inertia_kgm2 = 1.0;  // no part in anything: the speed is held
  s.loads.push_back({"imposed_speed", {}, 0, 0, 0, {{0.0, machine.rated_speed_rpm}}});
  s.supply.kind = "mains";
  s.supply.line_voltage_V = machine.rated_line_voltage_V;
  s.supply.frequency_Hz = machine.rated_frequency_Hz;
  return s;
}

OperatingPoint operating_point(const MachineSettings& machine) {
  OperatingPoint point = operating_point(machine_on_mains(machine));
  point.machine.inertia_kgm2 = point.machine.damping = 0.0;
  point.load_torque_Nm = point.row[P::load_torque] = point.steady.torque;
  return point;
}

linear::System system_at(const OperatingPoint& point) {
  return point.speed_held ? linear::machine_at_speed(point.machine)
                          : linear::machine_on_shaft(point.machine, point.speed_measured);
}

}  // namespace slipbench
