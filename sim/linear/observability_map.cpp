#include "sim/linear/observability_map.hpp"

#include <limits>
#include <memory>

#include "sim/linear/operating_point.hpp"
#include "sim/linear/truth.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {
namespace {

constexpr double two_pi = 6.28318530717958647693;
constexpr double share_of_path = 0.3;  // of the work, where there is one

RunSetup at_rest(Scenario s) {
  s.run.start = "standstill";
  return prepare_run(s, 0, 0);
}

}  // namespace

SpeedMapMaker::SpeedMapMaker(const Scenario& s, linear::SpeedModel model)
    : flux_(s), model_(model), unit_(linear::per_unit_of(s.machine.nameplate())) {
  const auto truth = std::make_shared<const Truth>(at_rest(s));
  circuit_ = truth->circuit;
  inertia_ = truth->inertia;
  damping_ = [truth](double speed_rad_s) { return truth->damping(speed_rad_s); };
}

linear::SpeedPoint SpeedMapMaker::point(double speed_rpm, double torque_Nm) const {
  const double speed = speed_rpm * rad_s_in_rpm;
  return linear::steady_speed_point(circuit_, inertia_, damping_(speed), flux_.at(speed, torque_Nm), torque_Nm, speed);
}

double SpeedMapMaker::at(const linear::SpeedPoint& point) const {
  return linear::speed_observability(point, model_, unit_).smallest;
}

double SpeedMapMaker::at(const PlantRow& row) const {
  const SinCos<double> angle = sincos(row[P::rotor_flux_angle]);
  linear::SpeedPoint p;
  p.machine.circuit = circuit_;
  p.machine.circuit.stator_resistance = row[P::stator_resistance];
  p.machine.circuit.rotor_resistance = row[P::rotor_resistance];
  p.machine.frame_frequency = two_pi * row[P::stator_frequency];
  p.machine.current = {row[P::i_d], row[P::i_q]};
  p.machine.rotor_flux = {row[P::rotor_flux], 0.0};
  p.machine.speed_rad_s = row[P::speed_rpm] * rad_s_in_rpm;
  p.machine.inertia_kgm2 = inertia_;
  p.machine.damping = damping_(p.machine.speed_rad_s);
  p.voltage = turn_back(angle, Vec2<double>{row[P::u_alpha], row[P::u_beta]});
  p.load_torque_Nm = row[P::load_torque];
  return at(p);
}

ObservabilityMap speed_map(const Scenario& s, const SpeedMapOptions& options, const MapProgress& progress) {
  const SpeedMapMaker maker(s, options.model);
  ObservabilityMap map;
  map.title = s.title;
  map.flux_text = maker.flux().text();
  map.model = options.model;
  map.plane = plane_of(s.machine, options.plane);
  map.at_rated = maker.at(maker.point(s.machine.rated_speed_rpm, s.machine.rated_torque_Nm));
  const double before = options.with_path ? share_of_path : 0.0;
  bool going = true;
  if (options.with_path) {
    const MapProgress part = [&](double done) { return going = !progress || progress(share_of_path * done); };
    map.path = path_of(
        s, options.blind_below_Hz, [&](const PlantRow& row) { return maker.at(row); }, part);
    for (const PathPoint& p : map.path->points) map.plane = holding(map.plane, p.speed_rpm, p.torque_Nm);
  }
  const Plane& plane = map.plane;
  map.lines = frequency_lines(plane, maker.flux(), options.blind_below_Hz);
  for (std::size_t i = 0; i < plane.speeds && going; ++i) {
    for (std::size_t k = 0; k < plane.torques; ++k) {
      const linear::SpeedPoint p = maker.point(plane.speed_rpm(i), plane.torque_Nm(k));
      map.rotor_flux_Wb.push_back(p.machine.rotor_flux.x);
      map.stator_frequency_Hz.push_back(p.machine.frame_frequency / two_pi);
      const bool reached = maker.flux().within_reach(p.machine.speed_rad_s, plane.torque_Nm(k));
      map.smallest.push_back(reached ? maker.at(p) : std::numeric_limits<double>::quiet_NaN());
    }
    const double done = static_cast<double>(i + 1) / static_cast<double>(plane.speeds);
    going = !progress || progress(before + (1.0 - before) * done);
  }
  return map;
}

ObservabilityMap speed_map(const MachineSettings& machine, const SpeedMapOptions& options,
                           const MapProgress& progress) {
  if (options.model != linear::SpeedModel::constant_speed)
    throw InputError(machine.file, "shaft.inertia_kgm2",
                     "a machine file gives no inertia, which the " + std::string(linear::name_of(options.model)) +
                         " model needs; take constant_speed, or a scenario",
                     "map");
  SpeedMapOptions alone = options;
  alone.with_path = false;
  ObservabilityMap map = speed_map(machine_on_mains(machine), alone, progress);
  map.title = machine.title;
  return map;
}

}  // namespace slipbench
