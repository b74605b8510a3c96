// compare: all estimators of a scenario over paired noise runs.
#include <fmt/format.h>

#include <memory>

#include "sim/record/out_file.hpp"
#include "tools/slipbench/compare_figure.hpp"
#include "tools/slipbench/comparison.hpp"
#include "tools/slipbench/interrupt.hpp"
#include "tools/slipbench/json_out.hpp"
#include "tools/slipbench/progress.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

// The scenario in which estimator `index` closes the loop, alone. Wherever the file takes the speed from an estimator, at
// the start or by an event, it takes it from this one; "measured" stays, so that a handover under way is compared as one.
// Where it never does, this one closes the loop from the start. Read again with the changes as overrides, so that the
// reader's checks apply to them.
Scenario closed_by(const Request& request, const Scenario& plain, std::size_t index) {
  std::vector<Override> overrides = request.overrides;
  const std::string quoted = "\"" + plain.estimators[index].name + "\"";
  bool handed_over = false;
  for (std::size_t i = 0; i < plain.events.size(); ++i) {
    const EventSettings& e = plain.events[i];
    if (e.kind != "speed_from" || e.estimator == "measured") continue;
    overrides.push_back({"event." + std::to_string(i) + ".estimator", quoted});
    handed_over = true;
  }
  if (plain.controller.speed_from != "measured" || !handed_over) overrides.push_back({"controller.speed_from", quoted});
  const bool direct = plain.controller.orientation == "direct";
  if (direct) overrides.push_back({"controller.flux_from", quoted});
  Scenario closed = read_scenario(request.file, overrides, request.seed);
  if (!direct) closed.controller.flux_from.clear();
  closed.estimators = {closed.estimators[index]};
  return closed;
}

std::vector<ComparisonJob> jobs_of(const Request& request, const Scenario& scenario) {
  std::vector<ComparisonJob> jobs;
  if (!request.in_loop) {
    ComparisonJob all{scenario, {}};
    for (std::size_t i = 0; i < scenario.estimators.size(); ++i) all.judged.push_back(i);
    jobs.push_back(std::move(all));
    return jobs;
  }
  if (scenario.controller.kind.empty()) {
    throw InputError("command line", "--in-loop",
                     "--in-loop: this scenario has no [controller], so there is no loop for an estimator to close",
                     "usage");
  }
  if (!scenario.controller.takes_speed()) {
    throw InputError("command line", "--in-loop",
                     "--in-loop: controller.kind is \"" + scenario.controller.kind +
                         "\", which takes no speed from anybody, so there is no loop for an estimator to close; leave "
                         "--in-loop out, or take rotor_flux_oriented",
                     "usage");
  }
  for (std::size_t i = 0; i < scenario.estimators.size(); ++i) jobs.push_back({closed_by(request, scenario, i), {i}});
  return jobs;
}

}  // namespace

int compare_verb(const Request& request) {
  want_scenario(request);
  const Scenario scenario = read_scenario(request.file, request.overrides, request.seed);
  if (scenario.estimators.empty()) {
    throw InputError(request.file, "estimator", "compare judges estimators, and this scenario has no [[estimator]]",
                     "missing");
  }
  const std::vector<ComparisonJob> jobs = jobs_of(request, scenario);
  std::unique_ptr<OutFile> figure_file;
  if (!request.figure.empty()) figure_file = std::make_unique<OutFile>(request.figure);

  Comparison comparison;
  {
    Progress progress("compare", request.progress, request.quiet);
    comparison = compare_estimators(jobs, request.runs, request.in_loop, request.threads, [&](double share) {
      progress.update(share);
      return !interrupted();
    });
  }
  std::vector<std::string> files;
  if (figure_file) {
    figure_file->write(compare_figure(comparison, scenario));
    figure_file->finish();
    files.push_back(fmt::format("figure: {}", request.figure));
  }
  if (request.json) {
    print(json_document(comparison));
  } else if (!request.quiet) {
    print(comparison_summary(comparison, scenario, files));
  }
  if (comparison.stopped) return ExitStatus::stopped;
  for (const ComparedEstimator& estimator : comparison.estimators) {
    if (estimator.diverged_runs() > 0) return ExitStatus::bad_result;
  }
  return ExitStatus::done;
}

}  // namespace slipbench
