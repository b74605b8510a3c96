// The way of a scenario's run through the torque-speed plane, and how long its speed could not be seen.
//
// Blind: |stator frequency| below `blind_below_Hz`, or hardly any flux (below 10 % of what the drive has at rest): no back-EMF to tell the
// speed by. 0.5 Hz is where the promise of the shipped observers ends and their trust falls to a half; drives without a sensor are
// commonly rated from 0.5 to 1 Hz on (common practice). What hurts is dwelling there, so the longest stretch is told beside the sum.
#pragma once

#include <vector>

#include "sim/engine/plant_row.hpp"
#include "sim/linear/plane.hpp"

namespace slipbench {

struct PathPoint {
  double time_s = 0.0, speed_rpm = 0.0, torque_Nm = 0.0, stator_frequency_Hz = 0.0, rotor_flux_Wb = 0.0;
  bool blind = false;
  double observability = 0.0;  // at the true state, transients included
};

struct ScenarioPath {
  std::vector<PathPoint> points;  // one a trace period
  double blind_below_Hz = 0.0;
  double duration_s = 0.0, blind_s = 0.0, longest_blind_s = 0.0, longest_from_s = 0.0;
  bool diverged = false;
};

// Runs the scenario and asks `observability` of each row. Throws as simulate() does.
ScenarioPath path_of(const Scenario& scenario, double blind_below_Hz,
                     const std::function<double(const PlantRow&)>& observability, const MapProgress& progress = {});

}  // namespace slipbench
