// All that a run left behind, as plain data for the summary and for JSON.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "sim/board/in_loop.hpp"
#include "sim/engine/simulate.hpp"
#include "sim/score/figures.hpp"
#include "sim/score/means.hpp"
#include "sim/stream/figures.hpp"

namespace slipbench {

struct EstimatorResult {
  std::string name, kind, digest;
  EstimatorFigures figures;
  double step_ns = 0.0;
};

struct BoardResult {
  std::string link, name;
  std::string used_unit;  // "instructions", "ns"; "" for none
  double control_period_s = 0.0;
  double baud = 0.0;  // of a serial line as given, else 0
  ExchangeFigures exchange;
  BoardOutcome outcome;
};

struct RunResult {
  const Scenario* scenario = nullptr;
  RunOutcome outcome;
  std::string status;  // done | diverged | lost
  bool interrupted = false;
  std::vector<NamedValue> final, mean;
  DriveFigures drive;
  std::vector<EstimatorResult> estimators;
  std::string plant_digest;
  std::optional<StreamFigures> stream;
  std::optional<BoardResult> board;
  std::vector<std::string> files;  // "trace: run.csv (2001 rows, 41 columns)"
};

// The summary that a person reads.
std::string run_summary(const RunResult& result);
std::string board_summary(const BoardResult& board);  // its part of it

}  // namespace slipbench
