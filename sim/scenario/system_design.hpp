// [design] of a state-space file: which keys go with which kind, and their shapes. For system_file.cpp alone.
#pragma once

#include "sim/scenario/system_file.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

// `system`: reduced, as the gains are for. Throws InputError.
DesignRequest read_design(const Node& node, const linear::System& system);

}  // namespace slipbench
