// Fingerprints of a run: SHA-256 over little-endian float64 rows at trace_period_s, one of the plant's columns and one of
// each estimator's five, in contract order. Every NaN counts as the bits 0x7ff8000000000000.
#pragma once

#include <string>
#include <vector>

#include "sim/engine/observer.hpp"
#include "sim/record/sha256.hpp"

namespace slipbench {

// Adds the little-endian bytes of each number.
void add_numbers(Sha256& sha, std::span<const double> numbers);

class RunDigest : public RunObserver {
 public:
  void begin(const RunInfo& info) override;
  void trace_row(const RowView& view) override;

  [[nodiscard]] std::string plant() const { return plant_.hex(); }
  [[nodiscard]] std::string estimator(std::size_t index) const { return estimators_.at(index).hex(); }
  [[nodiscard]] std::size_t estimator_count() const { return estimators_.size(); }

 private:
  Sha256 plant_;
  std::vector<Sha256> estimators_;
};

}  // namespace slipbench
