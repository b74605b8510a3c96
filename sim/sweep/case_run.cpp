#include "sim/sweep/case_run.hpp"

#include "sim/score/drive_score.hpp"
#include "sim/score/estimator_score.hpp"

namespace slipbench {

std::vector<std::string> figure_columns(const Scenario& scenario) {
  std::vector<std::string> names;
  for (const EstimatorSettings& e : scenario.estimators) {
    for (const auto& entry : estimator_figures) names.push_back(e.name + "." + std::string(entry.name));
  }
  for (const auto& entry : drive_figures) names.push_back("drive." + std::string(entry.name));
  return names;
}

void fill_row(ResultRow& row, const Scenario& scenario, const RunOutcome& outcome,
              const std::vector<EstimatorFigures>& estimators, const DriveFigures& drive) {
  row.status = "done";
  row.message.clear();
  row.figures.clear();
  for (std::size_t i = 0; i < estimators.size(); ++i) {
    if (estimators[i].lost_at_s && row.message.empty()) {
      row.status = "lost";
      row.message = scenario.estimators[i].name;
    }
    for (const auto& entry : estimator_figures) row.figures.push_back(estimators[i].*entry.value);
  }
  for (const auto& entry : drive_figures) row.figures.push_back(drive.*entry.value);
  if (!outcome.diverged) return;
  row.status = "diverged";
  row.message = outcome.diverged_what + " at " + std::to_string(outcome.diverged_at_s) + " s";
  row.figures.assign(row.figures.size(), {});
}

void fill_refused(ResultRow& row, const std::string& why, std::size_t figures) {
  row.status = "refused";
  row.message = why;
  row.figures.assign(figures, {});
}

void run_case(ResultRow& row, const Scenario& scenario, std::uint32_t run, const std::function<bool()>& keep_going) {
  const ScoreBasis basis = score_basis(scenario);
  EstimatorScore estimators(basis);
  DriveScore drive(basis);
  RunObserver* const observers[] = {&estimators, &drive};
  RunOptions options;
  options.noise_run = run;
  if (keep_going) options.keep_going = [&](double) { return keep_going(); };
  const RunOutcome outcome = simulate(scenario, observers, options);
  fill_row(row, scenario, outcome, estimators.figures(), drive.figures());
}

}  // namespace slipbench
