// Joins stores of shards, made on this machine or others, into one.
#pragma once

#include <cstdint>
#include <string>
#include <vector>

#include "sim/sweep/plan.hpp"
#include "sim/sweep/store.hpp"

namespace slipbench {

struct MergeOutcome {
  std::uint64_t rows = 0, twice = 0, missing = 0;  // now in the joined store; found in two stores; still to be run
};

// Copies all rows of `parts` into `whole`, which was opened for the plan. InputError where a part was made from something else.
// Rows of the same plan are the same wherever they were made, so that one that is there twice does no harm.
MergeOutcome merge_stores(const SweepPlan& plan, Store& whole, const std::vector<std::string>& parts);

}  // namespace slipbench
