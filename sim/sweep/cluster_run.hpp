// An array of shards followed to its end: submitted, looked after, joined. Slurm is reached through its commands alone: sbatch, squeue,
// scancel.
//
// A shard is finished when its store is there. One that is neither finished nor in the queue was lost and is submitted again, at most
// three times. Started anew after it was ended itself, it takes up the array that is still there. One at a time: it holds the store.
#pragma once

#include <functional>
#include <string>

#include "sim/sweep/cluster.hpp"
#include "sim/sweep/merge.hpp"
#include "sim/sweep/plan.hpp"
#include "sim/sweep/store.hpp"

namespace slipbench {

struct ClusterProgress {
  double share = 0.0;  // 0..1
  std::uint64_t finished = 0, running = 0, waiting = 0;
  std::string why;  // the reason that Slurm gives for waiting
};

struct ClusterOutcome {
  std::uint64_t shards = 0, submitted = 0;  // of this call; shards whose rows were all there are not run
  std::uint64_t lost = 0;                   // submitted again
  MergeOutcome merged;
  double wall_s = 0.0;
  bool stopped = false;
};

// Shards where none are asked for: no more than there are units.
std::uint64_t usual_shards(const SweepPlan& plan);

// `keep_going` is asked about once a second; false cancels the array and keeps the stores of shards. OutsideError: Slurm is not there or
// no longer answers, or a shard failed (with the end of its log).
ClusterOutcome run_on_cluster(const SweepPlan& plan, Store& store, const ClusterJob& job,
                              const std::function<bool(const ClusterProgress&)>& keep_going);

}  // namespace slipbench
