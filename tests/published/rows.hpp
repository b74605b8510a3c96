// Keeps every trace row of a run, for tests that look inside.
#pragma once

#include <vector>

#include "sim/engine/simulate.hpp"

namespace slipbench::published {

class Rows : public RunObserver {
 public:
  void trace_row(const RowView& view) override { rows.push_back(*view.plant); }
  // The row nearest to this time.
  [[nodiscard]] const PlantRow& at(double time_s) const {
    const PlantRow* best = &rows.front();
    for (const auto& row : rows) {
      if (std::fabs(row[P::time] - time_s) < std::fabs((*best)[P::time] - time_s)) best = &row;
    }
    return *best;
  }
  std::vector<PlantRow> rows;
};

inline Rows rows_of(const Scenario& scenario) {
  Rows rows;
  RunObserver* observer = &rows;
  simulate(scenario, {&observer, 1});
  return rows;
}

}  // namespace slipbench::published
