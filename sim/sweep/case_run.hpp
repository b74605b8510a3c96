// One case and run: simulated, scored, and laid out as a row of the store.
#pragma once

#include <string>
#include <vector>

#include "sim/engine/simulate.hpp"
#include "sim/scenario/scenario.hpp"
#include "sim/score/figures.hpp"
#include "sim/sweep/store.hpp"

namespace slipbench {

// NAME.FIGURE of each estimator, then drive.FIGURE: the columns of a row's figures.
std::vector<std::string> figure_columns(const Scenario& scenario);

// Fills status, message and figures. A diverged run has no figures: they would be those of another window.
void fill_row(ResultRow& row, const Scenario& scenario, const RunOutcome& outcome,
              const std::vector<EstimatorFigures>& estimators, const DriveFigures& drive);
// The same for a case that could not be set up.
void fill_refused(ResultRow& row, const std::string& why, std::size_t figures);

// In double, whatever the scenario holds. False from `keep_going` ends it early.
void run_case(ResultRow& row, const Scenario& scenario, std::uint32_t run, const std::function<bool()>& keep_going);

}  // namespace slipbench
