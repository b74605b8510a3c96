// Means of trace columns over the score window: plant and estimator columns at every control tick, measured ones (which
// hold between ticks) at every trace row. Angles are averaged as plain numbers. A column that is not finite throughout
// the window has no mean. `last` keeps the last trace row for the run's final values.
#pragma once

#include <string>
#include <vector>

#include "sim/engine/observer.hpp"
#include "sim/score/basis.hpp"

namespace slipbench {

struct NamedValue {
  std::string name;
  double value;  // NaN: none
};

class ColumnMeans : public RunObserver {
 public:
  explicit ColumnMeans(ScoreWindow window) : window_(window) {}
  void begin(const RunInfo& info) override;
  void control_tick(const TickView& view) override;
  void trace_row(const RowView& view) override;

  // In contract order: plant, measured, estimators.
  [[nodiscard]] std::vector<NamedValue> means() const;
  [[nodiscard]] std::vector<NamedValue> last() const;  // empty before the first row

 private:
  ScoreWindow window_;
  double control_period_s_ = 0.0;
  std::size_t measured_count_ = 0;
  std::vector<std::string> names_;
  std::vector<double> tick_sums_, row_sums_, last_;  // plant then estimators; measured; all
  double ticks_ = 0, rows_ = 0;
};

}  // namespace slipbench
