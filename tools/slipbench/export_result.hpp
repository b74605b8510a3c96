// What `export` made, as plain data for the summary and for JSON.
#pragma once

#include <string>
#include <vector>

#include "tools/slipbench/board_cost.hpp"
#include "tools/slipbench/clock_band.hpp"

namespace slipbench {

// One part, or the controller and an estimator together, that must fit into a control period.
struct ShortestPeriod {
  std::string of;
  double instructions = 0.0;
};

struct ExportResult {
  std::string scenario, folder, precision;
  double control_period_s = 0.0;
  std::vector<ExportedPart> parts;
  std::vector<BoardCost> costs;  // of each part; empty without --cost
  ClockBand band;

  [[nodiscard]] std::vector<ShortestPeriod> periods() const;
};

std::string export_summary(const ExportResult& result);

}  // namespace slipbench
