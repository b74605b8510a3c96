// Who needs whom: supply, controller, estimators, sensors, loads.
#pragma once

#include "sim/scenario/scenario.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

void check_wiring(const Scenario& scenario, const Node& root);

}  // namespace slipbench
