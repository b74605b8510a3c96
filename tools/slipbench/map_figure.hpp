// Figures of the torque-speed plane: where speed can be seen, and where an estimator is stable. The darker, the worse: hard to see, slow to
// settle. Both show the line of stator frequency zero and the blind band about it; the first a scenario's way, blind stretches marked.
#pragma once

#include <string>

#include "sim/linear/estimator_map.hpp"

namespace slipbench {

std::string map_figure(const ObservabilityMap& map);
std::string map_figure(const EstimatorMap& map);

}  // namespace slipbench
