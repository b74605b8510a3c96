// Estimators over N paired noise runs: run r sees the same noise whichever estimator is judged, so that differences
// between estimators are taken run by run.
//
// Riding along, one simulation judges all estimators; in the loop, each estimator closes the speed loop (and the flux loop
// under direct orientation) in a simulation of its own. Runs are shared out among threads; results stand in order of run
// and do not depend on the number of threads.
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "sim/engine/simulate.hpp"
#include "sim/score/paired.hpp"

namespace slipbench {

struct ComparedEstimator {
  std::string name, kind;
  std::vector<std::vector<Figure>> values;  // [figure][run]; empty where the run gave no number
  std::vector<bool> lost, diverged;         // [run]; a diverged loop is lost too
  [[nodiscard]] std::size_t lost_runs() const;
  [[nodiscard]] std::size_t diverged_runs() const;
};

struct Comparison {
  std::vector<std::string_view> figure_names, figure_units;  // drive figures too when in the loop
  std::vector<bool> finished;                                // [run]; all true unless it was stopped
  std::vector<ComparedEstimator> estimators;                 // in file order
  bool in_loop = false, stopped = false;
  double simulated_s = 0.0, wall_s = 0.0;
  unsigned threads = 1;

  [[nodiscard]] std::size_t runs() const;  // that were finished
  [[nodiscard]] std::size_t figure(std::string_view name) const;
  [[nodiscard]] Interval interval(std::size_t estimator, std::size_t figure) const;
  [[nodiscard]] Interval difference(std::size_t a, std::size_t b, std::size_t figure) const;  // a - b
};

struct ComparisonJob {
  Scenario scenario;                // one for all, or one for each estimator when in the loop
  std::vector<std::size_t> judged;  // index in `estimators` of each estimator of that scenario
};

// keep_going(share done): called from the working threads, must stand that; false stops the comparison.
Comparison compare_estimators(const std::vector<ComparisonJob>& jobs, std::uint32_t runs, bool in_loop,
                              unsigned threads, const std::function<bool(double)>& keep_going);

// The tables that a person reads.
std::string comparison_summary(const Comparison& comparison, const Scenario& scenario,
                               const std::vector<std::string>& files);

}  // namespace slipbench
