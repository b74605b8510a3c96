// What the engine tells while it runs, and who listens: score, trace, digest, figure, stream. Observers never change the
// run. Calls come from the engine's thread, in order of time; spans live for the call only.
#pragma once

#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include "controllers/control.hpp"
#include "estimators/sample.hpp"
#include "sim/engine/columns.hpp"

namespace slipbench {

// One control tick: the truth and every estimate of it, all at that tick.
struct TickView {
  std::int64_t tick = 0;  // control ticks from 0
  double time_s = 0.0;
  const PlantRow* plant = nullptr;              // value just after a jump
  std::span<const Estimate<double>> estimates;  // in file order
  bool clipped = false;                         // the controller's voltage limit acted
  // What estimators and controller saw and what was commanded; a run alone only, and with a controller the last two.
  const Sample<double>* sample = nullptr;
  const Measurement<double>* measurement = nullptr;
  const Command<double>* command = nullptr;
};

// One trace row: plant columns, measured columns, five columns for each estimator, as `RunInfo::columns()` names them.
struct RowView {
  std::int64_t row = 0;
  const PlantRow* plant = nullptr;
  std::span<const double> measured;
  std::span<const double> estimates;  // five a piece, in file order
};

struct RunInfo {
  std::string title;
  double trace_period_s = 0.0, control_period_s = 0.0, duration_s = 0.0;
  std::vector<Column> plant, measured;  // estimator columns follow from the names
  std::vector<std::string> estimator_names, estimator_kinds;

  [[nodiscard]] std::vector<Column> columns() const;  // all that a row has, in contract order
};

class RunObserver {
 public:
  virtual ~RunObserver() = default;
  virtual void begin(const RunInfo&) {}
  virtual void control_tick(const TickView&) {}
  virtual void trace_row(const RowView&) {}
  virtual void end() {}
};

}  // namespace slipbench
