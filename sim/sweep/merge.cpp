#include "sim/sweep/merge.hpp"

#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

constexpr std::size_t rows_per_batch = 4096;

}  // namespace

MergeOutcome merge_stores(const SweepPlan& plan, Store& whole, const std::vector<std::string>& parts) {
  MergeOutcome outcome;
  // All are looked at before a row is copied.
  for (const std::string& path : parts) Store(path).demand_same(whole.origin());
  std::uint64_t copied = 0;
  const std::uint64_t before = whole.rows();
  for (const std::string& path : parts) {
    const Store part(path);
    std::vector<ResultRow> batch;
    part.each_row([&](const ResultRow& row) {
      batch.push_back(row);
      if (batch.size() == rows_per_batch) whole.write(batch), batch.clear();
      ++copied;
      return true;
    });
    whole.write(batch);
  }
  outcome.rows = whole.rows();
  outcome.twice = before + copied - outcome.rows;
  const std::uint64_t wanted = plan.cases() * plan.runs;
  outcome.missing = wanted > outcome.rows ? wanted - outcome.rows : 0;
  return outcome;
}

}  // namespace slipbench
