#include "sim/engine/lanes/lanes.hpp"

extern "C" {
void slipbench_lanes_sse2(slipbench::LanesJob* job);
void slipbench_lanes_avx2(slipbench::LanesJob* job);
void slipbench_lanes_avx512(slipbench::LanesJob* job);
}

namespace slipbench {

namespace {

constexpr LaneSet sets[] = {
    {"sse2", [] { return __builtin_cpu_supports("sse2") != 0; }, slipbench_lanes_sse2},
    {"avx2", [] { return __builtin_cpu_supports("avx2") != 0; }, slipbench_lanes_avx2},
    {"avx512",
     [] {
       return __builtin_cpu_supports("avx512f") != 0 && __builtin_cpu_supports("avx512dq") != 0 &&
              __builtin_cpu_supports("avx512vl") != 0;
     },
     slipbench_lanes_avx512},
};

}  // namespace

std::span<const LaneSet> lane_sets() { return sets; }

const LaneSet& best_lane_set() {
  const LaneSet* best = &sets[0];
  for (const auto& set : sets) {
    if (set.available()) best = &set;
  }
  return *best;
}

}  // namespace slipbench
