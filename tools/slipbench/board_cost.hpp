// What an exported step costs on a small board: compiled for a Cortex-M4F, run over its test vectors on an emulated one, its
// instructions counted exactly. Instructions are not time: what a part makes of them is a band of clocks per instruction.
#pragma once

#include <cstdint>
#include <string>
#include <vector>

#include "sim/export/exported.hpp"

namespace slipbench {

struct BoardCost {
  std::string name;
  std::uint64_t least = 0, most = 0, ticks = 0;  // instructions a step, call and return included
  double mean = 0.0;
  std::uint64_t flash_bytes = 0;  // code and constants of the step
};

// Throws OutsideError where a tool is missing (and says what to install), fails, or where a bit differs from the host's.
void demand_board_tools();
BoardCost cost_on_board(const ExportedPart& part);

}  // namespace slipbench
