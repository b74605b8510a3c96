// Every case of a plan, in packs and threads, into a store; what is there already is left alone.
//
// Work is cut into units: `cases_per_unit` neighbouring cases of one noise run. A shard i of n takes every n-th unit. A unit is done
// when all of its rows are in the store, else it is run anew: rows are a pure function of plan and scenario.
#pragma once

#include <cstdint>
#include <functional>
#include <map>
#include <string>

#include "sim/sweep/plan.hpp"
#include "sim/sweep/store.hpp"

namespace slipbench {

inline constexpr std::uint64_t cases_per_unit = 64;

struct Shard {
  std::uint64_t index = 0, count = 1;  // index < count
};

struct SweepOptions {
  unsigned threads = 0;  // 0: all cores
  std::string isa;       // "": the widest set of this processor; "double": no lanes
  Shard shard;
  // Told now and then from the caller's thread; false stops, and what was finished is kept.
  std::function<bool(const struct SweepProgress&)> keep_going;
};

struct SweepProgress {
  std::uint64_t rows = 0, done = 0, resumed = 0;  // of this shard: all there will be, now in the store, there before
  double seconds = 0.0;
};

struct SweepOutcome {
  std::uint64_t rows = 0, done = 0, resumed = 0, diverged = 0, refused = 0, lost = 0;
  double wall_s = 0.0, simulated_s = 0.0;  // of this call, all cases together
  unsigned threads = 1;
  std::size_t lanes = 1;  // of a pack
  std::string isa;
  std::uint64_t in_lanes = 0;                         // rows that ran in packs
  std::map<std::string, std::uint64_t> not_in_lanes;  // rows that ran alone, by reason
  bool stopped = false;
};

// What the plan and all files behind it say, item by item: what a store is compared by.
Origin origin_of(const SweepPlan& plan);
StoreColumns columns_of(const SweepPlan& plan);

// Rows of a shard that are in units not yet complete.
std::uint64_t missing_rows(const SweepPlan& plan, const Store& store, Shard shard);

// Throws InputError where the plan's own scenario can't be read, OutsideError from the store.
SweepOutcome run_sweep(const SweepPlan& plan, Store& store, const SweepOptions& options);

}  // namespace slipbench
