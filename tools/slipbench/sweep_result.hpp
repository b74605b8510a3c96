// All that a sweep left behind, as plain data for the summary and for JSON.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "sim/sweep/cluster_run.hpp"
#include "sim/sweep/merge.hpp"
#include "sim/sweep/store_sensitivity.hpp"
#include "sim/sweep/sweep.hpp"

namespace slipbench {

// A figure over all rows: least, 5 %, median, 95 %, largest of those that have it.
struct Distribution {
  std::string figure;
  std::uint64_t count = 0;
  std::vector<double> values;  // five, or none
};

struct WorstRows {
  std::string figure;
  std::vector<ResultRow> rows;  // worst first
};

struct SweepResult {
  const SweepPlan* plan = nullptr;
  std::string store;
  SweepOutcome outcome;
  std::optional<MergeOutcome> merged;
  std::optional<ClusterOutcome> cluster;                        // --on slurm
  std::uint64_t rows = 0, diverged = 0, refused = 0, lost = 0;  // in the store
  std::vector<Distribution> distributions;
  std::vector<WorstRows> worst;
  std::vector<FigureSensitivity> sensitivities;  // of a drawn plan whose rows are all there, or joined
  std::vector<std::string> files;
};

// The summary that a person reads.
std::string sweep_summary(const SweepResult& result);
// The part of it on sensitivities, "" without (sensitivity_report.cpp).
std::string sensitivity_text(const SweepResult& result);

}  // namespace slipbench
