// Nodes as TOML text that reads back as the same nodes; comments and the way of writing numbers are not kept.
#pragma once

#include <string>

#include "sim/scenario/tree.hpp"

namespace slipbench {

// `root` is a table. Its own values come first, then its tables, lists of tables as [[name]].
std::string toml_text(const Node& root);

}  // namespace slipbench
