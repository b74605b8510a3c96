// `--set key=value` applied to the parsed file, before anything is checked.
#pragma once

#include <vector>

#include "sim/scenario/read.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

// Dotted keys; elements of a list by number, the next free number appends one. Values are TOML, else strings. Tables on
// the way are made as needed; whether the schema knows the key shows when the tree is read, placed as "--set:key", or
// as "--set:" and `before` and the key.
void apply_overrides(Node& root, const std::vector<Override>& overrides, const std::string& before = {});

}  // namespace slipbench
