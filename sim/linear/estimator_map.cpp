#include "sim/linear/estimator_map.hpp"

#include <limits>
#include <stdexcept>

#include "estimators/methods.hpp"
#include "sim/engine/setup_parts.hpp"
#include "sim/engine/start.hpp"
#include "sim/linear/error_dynamics.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {
namespace {

constexpr double two_pi = 6.28318530717958647693, none = std::numeric_limits<double>::quiet_NaN();
constexpr double marginal_per_s = 0.1;
constexpr int held_ticks = 400, belief_steps = 4;

// Two sensors: alpha and beta carry 1 and 5/3 of a sensor's variance, 4/3 on average over a turn, three carry 2/3.
EstimatorSetup evenly_noisy(EstimatorSetup setup) {
  if (setup.current_sensors == 2) setup.current_noise_A *= 1.41421356237309504880;
  setup.current_sensors = 3;
  return setup;
}

// With a wrong belief there may be several steady estimates: the one that grows out of the truth as the belief does is followed.
std::vector<EstimatorSetup> beliefs(const EstimatorSetup& believed, const Circuit<double>& truth) {
  EstimatorSetup setup = believed;
  const auto now = numbers_of<double>(setup.circuit);
  const auto from = numbers_of<const double>(truth), to = numbers_of<const double>(believed.circuit);
  bool right = true;
  for (std::size_t i = 0; i < now.size(); ++i) right = right && *from[i] == *to[i];
  if (right) return {believed};
  std::vector<EstimatorSetup> way;
  for (int step = 0; step <= belief_steps; ++step) {
    const double share = static_cast<double>(step) / belief_steps;
    for (std::size_t i = 0; i < now.size(); ++i) *now[i] = *from[i] + share * (*to[i] - *from[i]);
    way.push_back(setup);
  }
  return way;
}

EstimatorPoint point_of(const ErrorDynamics& e) {
  using State = EstimatorPoint::State;
  if (!e.settled()) return {State::unsettled, none, none};
  const State state = e.slowest_per_s < -marginal_per_s   ? State::stable
                      : e.slowest_per_s <= marginal_per_s ? State::marginal
                                                          : State::unstable;
  return {state, e.slowest_per_s, e.speed_error_rad_s / rad_s_in_rpm};
}

}  // namespace

EstimatorMapMaker::EstimatorMapMaker(const Scenario& s, std::size_t which) : flux_(s) {
  const EstimatorSettings& wanted = s.estimators.at(which);
  const EstimatorSetup setup = evenly_noisy(estimator_setup(s, current_noise(s)));
  const Circuit<double> truth = s.machine.circuit();
  each_estimator_method([&]<class Method>() {
    if (Method::kind != wanted.kind) return;
    // Constants from the true circuit to the believed one; one set where the belief is right.
    std::vector<typename Method::template Constants<double>> way;
    for (const EstimatorSetup& one : beliefs(setup, truth)) way.push_back(Method::prepare(one, wanted.settings));
    at_ = [flux = flux_, way, setup, truth](double speed_rpm, double torque_Nm) -> EstimatorPoint {
      const double speed = speed_rpm * rad_s_in_rpm;
      if (!flux.within_reach(speed, torque_Nm)) return {EstimatorPoint::State::beyond, none, none};
      EstimatorSetup here = setup;
      here.start_rotor_flux_Wb = flux.at(speed, torque_Nm);
      here.start_speed_rad_s = speed;
      const TurningPoint p =
          turning_point(truth, setup.control_period_s, here.start_rotor_flux_Wb, torque_Nm, truth.pole_pairs * speed);
      auto state = held_at_truth<Method>(way[0], Method::begin(here, way[0]), p, held_ticks);
      FixedPoint<Method> found;
      for (const auto& c : way) found = find_fixed_point<Method>(c, state, p);
      return point_of(dynamics_at<Method>(found, p));
    };
  });
  if (!at_)
    throw InputError(s.path, "estimator." + std::to_string(which) + ".kind",
                     "estimator '" + wanted.name + "' is of kind \"" + wanted.kind +
                         "\", whose equations are not built in: its error can't be linearised",
                     "estimator");
}

EstimatorMap estimator_map(const Scenario& s, std::size_t which, const EstimatorMapOptions& options,
                           const MapProgress& progress) {
  const EstimatorMapMaker maker(s, which);
  EstimatorMap map;
  map.title = s.title;
  map.name = s.estimators[which].name;
  map.kind = s.estimators[which].kind;
  map.flux_text = maker.flux().text();
  map.plane = plane_of(s.machine, options.plane);
  const Plane& plane = map.plane;
  map.lines = frequency_lines(plane, maker.flux(), options.blind_below_Hz);
  bool going = true;
  for (std::size_t i = 0; i < plane.speeds && going; ++i) {
    for (std::size_t k = 0; k < plane.torques; ++k)
      map.points.push_back(maker.at(plane.speed_rpm(i), plane.torque_Nm(k)));
    going = !progress || progress(static_cast<double>(i + 1) / static_cast<double>(plane.speeds));
  }
  return map;
}

EstimatorMap estimator_map(Scenario s, const std::string& kind, const EstimatorMapOptions& options,
                           const MapProgress& progress) {
  s.estimators.assign(1, {});
  s.estimators[0].name = s.estimators[0].kind = kind;
  return estimator_map(s, 0, options, progress);
}

}  // namespace slipbench
