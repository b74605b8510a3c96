// The first words with a board: asks for its hello, and makes a scenario's converters those that the board has.
#pragma once

#include <chrono>

#include "sim/board/frames.h"
#include "sim/board/link.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

// Asks until a hello of this session comes, every 0.25 s. Throws OutsideError for a board that is silent until `patience` is over, is
// gone, speaks another version, or says of itself what cannot be.
board_hello hail(Link& link, std::chrono::milliseconds patience);

std::string name_of(const board_hello& hello);

// The scenario that this board can drive: its controller left out of the loop, converters that were ideal given the board's bits and range.
// Throws InputError, with the key, where board and scenario do not fit: control period, converters, encoder, mains, a steady
// start, an estimator that is called `board`.
Scenario fit(Scenario scenario, const board_hello& hello);
// What of that can be said before a board is there.
void check_drivable(const Scenario& scenario);

}  // namespace slipbench
