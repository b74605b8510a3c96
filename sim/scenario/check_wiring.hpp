// Who needs whom: supply, controller, estimators, sensors, loads.
#pragma once

#include "sim/scenario/scenario.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

void check_wiring(const Scenario& scenario, const Node& root);
// Its part for [[event]]: sensors that exist, times within the run, sources of speed.
void check_events(const Scenario& scenario, const Node& root);
// `name`, found at `key`, must be an estimator's (or "measured").
void check_named(const Scenario& scenario, const Node& root, const std::string& key, const std::string& name,
                 bool or_measured);

}  // namespace slipbench
