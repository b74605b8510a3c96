// Where a drive's speed can be seen: local observability (plant/linear/speed_observability.hpp) at the steady states of the torque-speed
// plane, with the line where it is lost and a scenario's path laid over it.
//
// On the line of stator frequency zero (frequency_lines.hpp) the constant_speed and unknown_load models lose speed altogether; known_load
// sees it through the shaft alone, weakly.
// Flux by flux_rule.hpp; motor torque and speed of a steady state, whatever load balances it.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "plant/linear/speed_observability.hpp"
#include "sim/linear/flux_rule.hpp"
#include "sim/linear/frequency_lines.hpp"
#include "sim/linear/scenario_path.hpp"

namespace slipbench {

struct SpeedMapOptions {
  PlaneOptions plane;
  linear::SpeedModel model = linear::SpeedModel::constant_speed;
  double blind_below_Hz = 0.5;
  bool with_path = true;  // run the scenario; the plane is widened to hold its way
};

// One point of the map; points are independent, and a maker may serve several threads.
class SpeedMapMaker {
 public:
  SpeedMapMaker(const Scenario& scenario, linear::SpeedModel model);
  [[nodiscard]] linear::SpeedPoint point(double speed_rpm, double torque_Nm) const;
  [[nodiscard]] double at(const linear::SpeedPoint& point) const;  // smallest scaled singular value
  [[nodiscard]] double at(const PlantRow& truth) const;            // of a running drive, transients included
  [[nodiscard]] const FluxRule& flux() const { return flux_; }

 private:
  FluxRule flux_;
  Circuit<double> circuit_;
  double inertia_;
  std::function<double(double)> damping_;
  linear::SpeedModel model_;
  linear::PerUnit unit_;
};

struct ObservabilityMap {
  std::string title, flux_text;
  linear::SpeedModel model{};
  Plane plane;
  std::vector<double> smallest, rotor_flux_Wb,
      stator_frequency_Hz;  // by plane.index(); NaN beyond the drive's reach; shorter where the work was stopped
  double at_rated = 0.0;    // the value at rated speed and torque
  FrequencyLines lines;
  std::optional<ScenarioPath> path;
};

// Throws InputError for a plane that can't be (plane.hpp), a blind_below_Hz that is not positive, a scenario that can't be run.
ObservabilityMap speed_map(const Scenario& scenario, const SpeedMapOptions& options, const MapProgress& progress = {});
// Of a machine alone on its rated flux: constant_speed, no path.
ObservabilityMap speed_map(const MachineSettings& machine, const SpeedMapOptions& options,
                           const MapProgress& progress = {});

}  // namespace slipbench
