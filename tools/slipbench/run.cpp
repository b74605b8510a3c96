// run: one simulation with everything that listens to it.
#include <fmt/format.h>

#include <memory>

#include "sim/record/digest.hpp"
#include "sim/record/out_file.hpp"
#include "sim/record/trace.hpp"
#include "sim/scenario/tree.hpp"
#include "sim/score/drive_score.hpp"
#include "sim/score/estimator_score.hpp"
#include "tools/slipbench/interrupt.hpp"
#include "tools/slipbench/json_out.hpp"
#include "tools/slipbench/pace.hpp"
#include "tools/slipbench/progress.hpp"
#include "tools/slipbench/publish.hpp"
#include "tools/slipbench/run_figure.hpp"
#include "tools/slipbench/run_result.hpp"
#include "tools/slipbench/table.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

std::string status_of(const RunResult& result) {
  if (result.outcome.diverged) return "diverged";
  for (const EstimatorResult& estimator : result.estimators) {
    if (estimator.figures.lost_at_s) return "lost";
  }
  return "done";
}

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

TraceOrigin origin_of(const Subject& subject, const Request& request, const Scenario& scenario) {
  std::string why;
  TraceOrigin origin{SLIPBENCH_VERSION, read_text(subject.file, why).value_or(""), "", scenario.seed,
                     request.noise_run};
  for (const Override& o : subject.overrides) origin.overrides += o.key + "=" + o.value + "\n";
  return origin;
}

}  // namespace

int run_verb(const Request& request) {
  const Subject subject = subject_of(request);
  const Scenario scenario = read_scenario(subject.file, subject.overrides, request.seed);
  const ScoreBasis basis = score_basis(scenario);

  // Outputs are opened first: a path that cannot be written costs no simulation.
  std::unique_ptr<Trace> trace;
  std::unique_ptr<OutFile> figure_file;
  if (!request.trace.empty()) trace = open_trace(request.trace, origin_of(subject, request, scenario));
  if (!request.figure.empty()) figure_file = std::make_unique<OutFile>(request.figure);

  EstimatorScore estimator_score(basis);
  DriveScore drive_score(basis);
  ColumnMeans means(basis.window);
  RunDigest digest;
  RunFigure figure(basis.window, basis.load_steps_s);
  const std::unique_ptr<StreamPublisher> stream = start_publishing(request, scenario);
  Pace pace(request.pace);
  std::vector<RunObserver*> observers = {&estimator_score, &drive_score, &means, &digest};
  if (trace) observers.push_back(trace.get());
  if (figure_file) observers.push_back(&figure);
  if (stream) observers.push_back(stream.get());
  if (request.pace > 0.0) observers.push_back(&pace);

  RunOptions options;
  options.noise_run = request.noise_run;
  options.time_steps = true;
  RunResult result;
  {
    Progress progress("run", request.progress, request.quiet);
    options.keep_going = [&](double share) {
      progress.update(share);
      return !interrupted() && !(trace && trace->failed());
    };
    result.outcome = simulate(scenario, observers, options);
  }

  result.scenario = &scenario;
  result.interrupted = result.outcome.stopped && interrupted();
  result.final = means.last();
  result.mean = means.means();
  result.drive = drive_score.figures();
  result.plant_digest = digest.plant();
  const auto figures = estimator_score.figures();
  for (std::size_t i = 0; i < scenario.estimators.size(); ++i) {
    const double step_ns = i < result.outcome.step_ns.size() ? result.outcome.step_ns[i] : 0.0;
    result.estimators.push_back(
        {scenario.estimators[i].name, scenario.estimators[i].kind, digest.estimator(i), figures[i], step_ns});
  }
  result.status = status_of(result);

  if (trace) {
    trace->finish();
    result.files.push_back(
        fmt::format("trace:  {} ({} rows, {} columns)", request.trace, trace->rows(), trace->columns()));
  }
  if (figure_file) {
    const RunOutcome& o = result.outcome;
    const std::string ended = o.diverged           ? fmt::format("DIVERGED at {} s", plain(o.diverged_at_s, 4))
                              : result.interrupted ? fmt::format("INTERRUPTED at {} s", plain(o.simulated_s, 4))
                                                   : "";
    figure_file->write(figure.svg(scenario, figures, ended, o.events));
    figure_file->finish();
    result.files.push_back(fmt::format("figure: {}", request.figure));
  }
  if (stream) {
    result.stream = stream->finish(result.outcome.diverged  ? "diverged"
                                   : result.outcome.stopped ? "interrupted"
                                                            : "done");
    result.files.push_back(stream_line(*result.stream));
  }
  if (request.json) {
    print(json_document(result));
  } else if (!request.quiet) {
    print(run_summary(result));
  }
  if (result.interrupted) return ExitStatus::stopped;
  return result.status == "done" ? ExitStatus::done : ExitStatus::bad_result;
}

}  // namespace slipbench
