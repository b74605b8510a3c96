// Where an estimator is stable: the slowest pole of its error (error_dynamics.hpp) over the torque-speed plane.
//
// Settings, belief, control period and sensor noise are the scenario's; two current sensors' noise, which turns with the frame, is taken
// as its mean over a turn. Flux by flux_rule.hpp. What sets current or speed off (dead time, converters) is left out.
#pragma once

#include <string>
#include <vector>

#include "sim/linear/observability_map.hpp"

namespace slipbench {

struct EstimatorPoint {
  // marginal: neither grows nor dies within 10 s, as on the line of lost observability; unsettled: no steady estimate was found there;
  // beyond: out of the drive's reach.
  enum class State { stable, marginal, unstable, unsettled, beyond } state = State::unsettled;
  double slowest_per_s = 0.0;    // largest ln|z| / T; NaN where unsettled or beyond
  double speed_error_rpm = 0.0;  // steady, of a wrong belief; NaN where unsettled or beyond
};

struct EstimatorMapOptions {
  PlaneOptions plane{0.5, 1.5, 81, 41};
  double blind_below_Hz = 0.5;
};

// Points are independent, and a maker may serve several threads. Throws InputError for an estimator without equations here (a plug-in,
// a program's own).
class EstimatorMapMaker {
 public:
  EstimatorMapMaker(const Scenario& scenario, std::size_t estimator);
  [[nodiscard]] EstimatorPoint at(double speed_rpm, double torque_Nm) const { return at_(speed_rpm, torque_Nm); }
  [[nodiscard]] const FluxRule& flux() const { return flux_; }

 private:
  FluxRule flux_;
  std::function<EstimatorPoint(double, double)> at_;
};

struct EstimatorMap {
  std::string title, flux_text, name, kind;
  Plane plane;
  std::vector<EstimatorPoint> points;  // by plane.index(); shorter where the work was stopped
  FrequencyLines lines;
};

EstimatorMap estimator_map(const Scenario& scenario, std::size_t estimator, const EstimatorMapOptions& options,
                           const MapProgress& progress = {});
// The same for a built-in kind with its default settings, where a scenario names no estimator.
EstimatorMap estimator_map(Scenario scenario, const std::string& kind, const EstimatorMapOptions& options,
                           const MapProgress& progress = {});

}  // namespace slipbench
