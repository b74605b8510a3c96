// Cases made ready for packs: ready_run() for each, with the run-ins of steady starts side by side in lanes, to the same bits.
#pragma once

#include <span>
#include <string>
#include <vector>

#include "sim/engine/lanes/lanes.hpp"
#include "sim/engine/setup.hpp"

namespace slipbench {

struct ReadyCase {
  RunSetup setup;       // at t = 0
  std::string refused;  // why the case cannot be run: the message of what simulate() would throw; empty: it is ready
};

// One answer a scenario, in order; `noise_runs` has as many. One bad case does not stop the others.
std::vector<ReadyCase> ready_cases(const LaneSet& set, std::span<const Scenario* const> scenarios,
                                   std::span<const std::uint32_t> noise_runs);

}  // namespace slipbench
