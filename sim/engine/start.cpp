#include "sim/engine/start.hpp"

#include <algorithm>

#include "plant/steady_state.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

constexpr double rad_s_per_rpm = 3.14159265358979323846 / 30.0;
constexpr double two_pi = 6.28318530717958647693;

// Speed at which the load takes the torque asked for under torque control; 0 is as good as any where nothing depends on it.
double balancing_speed(const Plant<double>& plant, double torque, double limit, const Scenario& s) {
  double low = -limit, high = limit;
  if (plant.load_at_start(low) > torque || plant.load_at_start(high) < torque) {
    throw InputError(
        s.path, "run.start",
        "start = \"steady\": no speed within twice the rated one at which the load takes the first torque reference; "
        "impose a speed or start from \"magnetised\"",
        "steady");
  }
  for (int i = 0; i < 200; ++i) {
    const double middle = 0.5 * (low + high);
    (plant.load_at_start(middle) < torque ? low : high) = middle;
  }
  return 0.5 * (low + high);
}

double first_of(const Knots& knots) { return Profile(knots, 1.0).line_at(0.0).at(0.0); }

SteadyState on_mains(const Scenario& s, const Plant<double>& plant) {
  const double w = two_pi * s.supply.frequency_Hz;
  const double peak = make_mains(s.supply.line_voltage_V, s.supply.frequency_Hz, 0.0).peak;
  const auto slip = stable_slip(plant.circuit(), peak, w, [&](double speed) { return plant.load_at_start(speed); });
  if (!slip) {
    throw InputError(s.path, "run.start",
                     "start = \"steady\": the load is beyond the machine's pull-out torque on this supply; "
                     "lower the load or raise supply.line_voltage_V",
                     "steady");
  }
  return steady_at_slip(plant.circuit(), peak, w, *slip);
}

SteadyState on_inverter(const Scenario& s, Plant<double>& plant) {
  const bool steady = s.run.start == "steady", speed_control = !s.reference.speed_rpm.empty();
  const Nameplate plate = s.machine.nameplate();
  const double pole_pairs = plant.circuit().pole_pairs;
  plant.set_state({}, steady && speed_control ? first_of(s.reference.speed_rpm) * rad_s_per_rpm : 0.0);
  double speed = plant.speed(), torque = 0.0;  // an imposed speed wins over the reference
  if (steady && speed_control) torque = plant.load_at_start(speed);
  if (steady && !speed_control) {
    torque = first_of(s.reference.torque_Nm);
    const bool held =
        std::any_of(s.loads.begin(), s.loads.end(), [](const auto& l) { return l.kind == "imposed_speed"; });
    if (!held) speed = balancing_speed(plant, torque, 2.0 * plate.speed_rad_s(), s);
  }
  const double electrical = fabs(pole_pairs * speed);
  const double weakened = min(1.0, plate.angular_frequency() / max(electrical, 1e-9));
  return steady_at_flux(plant.circuit(), weakened * s.reference.rotor_flux_Wb, torque, pole_pairs * speed);
}

}  // namespace

EstimatorSetup estimator_setup(const Scenario& s, double current_noise_A) {
  EstimatorSetup e;
  e.circuit = s.believed_circuit();
  e.nameplate = s.machine.nameplate();
  e.inertia_kgm2 = s.believed_inertia();
  e.viscous_friction_Nms = s.shaft.viscous_friction_Nms;
  e.control_period_s = s.run.control_period_s;
  e.current_sensors = static_cast<int>(s.sensors.current_phases);
  e.current_noise_A = current_noise_A;
  return e;
}

Modulation modulation_of(const Scenario& s) {
  return s.supply.modulation == "sine"            ? Modulation::sine
         : s.supply.modulation == "discontinuous" ? Modulation::discontinuous
                                                  : Modulation::space_vector;
}

ControllerSetup controller_setup(const Scenario& s, Modulation modulation, bool compensate_dead_time, bool sensorless) {
  ControllerSetup c;
  c.circuit = s.believed_circuit();
  c.nameplate = s.machine.nameplate();
  c.inertia_kgm2 = s.believed_inertia();
  c.control_period_s = s.run.control_period_s;
  c.delay_periods = static_cast<int>(s.controller.delay_periods);
  c.modulation = modulation;
  c.inverter = {s.supply.dc_link_V * s.belief.dc_link, s.supply.dead_time_s * s.belief.dead_time,
                s.supply.device_drop_V * s.belief.device_drop, s.supply.switching_frequency_Hz,
                s.supply.zero_current_width_A};
  c.compensate_dead_time = compensate_dead_time;
  c.direct_orientation = s.controller.orientation == "direct";
  c.speed_control = !s.reference.speed_rpm.empty();
  c.sensorless = sensorless;
  c.rotor_flux_reference_Wb = s.reference.rotor_flux_Wb;
  return c;
}

StartState start_state(const Scenario& s, Plant<double>& plant, std::int64_t first_tick) {
  if (s.run.start == "standstill") return {};
  const SteadyState now = s.on_mains() ? on_mains(s, plant) : on_inverter(s, plant);
  StartState start{true, now.flux, now.electrical_speed / plant.circuit().pole_pairs, now.voltage};
  if (s.on_mains()) {
    // The voltage has its phase at t = 0; a run-in begins that much earlier.
    const double t = static_cast<double>(first_tick) * s.run.control_period_s;
    const SinCos<double> angle = sincos_turns(s.supply.frequency_Hz * t + s.supply.phase_deg / 360.0);
    start.flux = {turn_forward(angle, now.flux.stator), turn_forward(angle, now.flux.rotor)};
  }
  return start;
}

InputError never_steady(const Scenario& s) {
  return InputError(
      s.path, "run.start",
      "start = \"steady\": no steady state at the first reference and load (the drive still moves after 16 s "
      "of simulated time); start from \"standstill\" or \"magnetised\", or change the operating point",
      "steady");
}

}  // namespace slipbench
