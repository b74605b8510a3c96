// design on scenarios: gains of the current loop and its observer, scheduled over speed, as a file that a scenario includes.
#pragma once

#include "tools/slipbench/options.hpp"

namespace slipbench {

int design_of_drive(const Request& request);  // the exit status

}  // namespace slipbench
