// run: one simulation with everything that listens to it.
#include <fmt/format.h>

#include "tools/slipbench/run_session.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

// What is run: a scenario as it stands, or a case of a plan.
struct Subject {
  std::string file;  // the scenario's
  std::vector<Override> overrides;
};

Subject subject_of(const Request& request) {
  if (kind_of_file(request.file) != FileKind::plan) {
    want_scenario(request);
    if (request.plan_case) {
      throw InputError("command line", "--case", "--case means something for a sweep plan only; this is a scenario",
                       "usage");
    }
    return {request.file, request.overrides};
  }
  const SweepPlan plan = read_plan(request.file, request.overrides, request.seed);
  const std::string cases = fmt::format("the plan has cases 0 to {} and runs 0 to {}", plan.cases() - 1, plan.runs - 1);
  if (!request.plan_case) {
    throw InputError(
        "command line", "--case",
        "this is a sweep plan: name one of its cases, as in --case 0, or run all with `slipbench sweep`; " + cases,
        "usage");
  }
  if (*request.plan_case >= plan.cases())
    throw InputError("command line", "--case", fmt::format("--case {}: {}", *request.plan_case, cases), "usage");
  if (request.noise_run >= plan.runs)
    throw InputError("command line", "--run", fmt::format("--run {}: {}", request.noise_run, cases), "usage");
  return {plan.scenario, CaseMaker(plan).overrides(*request.plan_case)};
}

}  // namespace

int run_verb(const Request& request) {
  const Subject subject = subject_of(request);
  const Scenario scenario = read_scenario(subject.file, subject.overrides, request.seed);
  RunSession session(request, origin_of(subject.file, subject.overrides, request, scenario), scenario);
  const RunResult result = session.run(scenario, {});
  tell(request, result);
  if (result.interrupted) return ExitStatus::stopped;
  return result.status == "done" ? ExitStatus::done : ExitStatus::bad_result;
}

}  // namespace slipbench
