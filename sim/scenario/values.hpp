// One node into one slot: type and range.
#pragma once

#include <string>

#include "sim/scenario/keys.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

// Throws InputError at the node where it is not what the row allows. `dotted` is the key as shown ("load.0.torque_Nm").
void store(Scenario& scenario, const Key& key, std::size_t index, const Node& node, const std::string& dotted);

}  // namespace slipbench
