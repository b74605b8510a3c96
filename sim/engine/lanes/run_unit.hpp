// The part of a lane unit that runs whole drives.
#pragma once

#include "sim/engine/lanes/run_job.hpp"

namespace slipbench {

void run_in_lanes(LanesRun& job) noexcept;
void drop_lanes(LanesRun& job) noexcept;
void settle_in_lanes(LanesRun& job) noexcept;

}  // namespace slipbench
