// The corner of the mismatch that hurts most: the point in the box of a plan's keys at which one figure is largest.
//
// The box: each [[vary]] from its least to its greatest value, each drawn key over its uniform range or mean +- 3 sigma; keys that move
// together are one coordinate. The noise is that of noise run 0 everywhere, so that the figure is a plain function of the keys; the
// best is run again on others, for a maximum over one noise flatters itself. A run that diverges is worse than any figure.
#pragma once

#include <cstdint>
#include <functional>
#include <string>
#include <vector>

#include "sim/score/paired.hpp"
#include "sim/sweep/plan.hpp"

namespace slipbench {

struct Coordinate {
  std::vector<std::string> keys;
  double low = 0.0, high = 0.0;
  std::string place;                        // "plan.toml:5:1"
  [[nodiscard]] double at(double u) const;  // 0 <= u <= 1; both ends exactly
};

// Throws InputError where a key holds no real number, spans nothing, or may not go to the ends.
std::vector<Coordinate> box_of(const SweepPlan& plan);

struct WorstCaseOptions {
  std::string figure;  // "ekf.speed_rmse_rpm"
  std::uint32_t budget = 200;
  std::uint32_t fresh_runs = 5;
  unsigned threads = 0;  // 0: all cores
  std::string isa;       // as for a sweep
  // Asked from any thread, with the runs done; false stops, and the best so far is kept.
  std::function<bool(std::size_t)> keep_going;
};

struct WorstCase {
  std::vector<Coordinate> box;
  std::vector<double> at;   // of each coordinate; empty: the figure came up in no run
  std::string status;       // done | lost | diverged
  std::string message;      // what diverged or was lost
  Figure value;             // none: diverged
  std::size_t runs = 0;     // of the search
  std::size_t without = 0;  // of them had no such figure
  std::vector<Figure> fresh;
  std::size_t fresh_diverged = 0;
  Interval fresh_mean;
  double least = 0.0;  // of the figure, over the search
  bool flat = false;   // the figure is the same everywhere
  bool stopped = false;
  std::uint64_t seed = 0;  // of the scenario
};

// InputError where there is no such figure.
WorstCase find_worst_case(const SweepPlan& plan, const WorstCaseOptions& options);

// The keys of the worst case, set; after the plan's own overrides.
std::vector<Override> overrides_of(const SweepPlan& plan, const WorstCase& worst);

// A scenario file that stands alone in `folder`: the plan's scenario with the keys set, headed by how it was found.
std::string scenario_text(const SweepPlan& plan, const WorstCase& worst, const std::string& figure,
                          const std::string& folder);

}  // namespace slipbench
