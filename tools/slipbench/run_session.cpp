#include "tools/slipbench/run_session.hpp"

#include <fmt/format.h>

#include <cmath>

#include "sim/scenario/tree.hpp"
#include "tools/slipbench/interrupt.hpp"
#include "tools/slipbench/json_out.hpp"
#include "tools/slipbench/progress.hpp"
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

}  // namespace

TraceOrigin origin_of(const std::string& file, const std::vector<Override>& overrides, const Request& request,
                      const Scenario& scenario) {
  std::string why;
  TraceOrigin origin{SLIPBENCH_VERSION, read_text(file, why).value_or(""), "", scenario.seed, request.noise_run};
  for (const Override& o : overrides) origin.overrides += o.key + "=" + o.value + "\n";
  return origin;
}

RunSession::RunSession(const Request& request, const TraceOrigin& origin, const Scenario& told)
    : request_(request),
      told_(told),
      trace_(request.trace.empty() ? nullptr : open_trace(request.trace, origin)),
      figure_file_(request.figure.empty() ? nullptr : std::make_unique<OutFile>(request.figure)),
      estimator_score_(score_basis(told)),
      drive_score_(score_basis(told)),
      means_(score_basis(told).window),
      figure_(score_basis(told).window, score_basis(told).load_steps_s),
      stream_(start_publishing(request, told)),
      pace_(request.pace) {}

RunResult RunSession::run(const Scenario& simulated, RunOptions options) {
  std::vector<RunObserver*> observers = {&estimator_score_, &drive_score_, &means_, &digest_};
  if (trace_) observers.push_back(trace_.get());
  if (figure_file_) observers.push_back(&figure_);
  if (stream_) observers.push_back(stream_.get());
  if (request_.pace > 0.0) observers.push_back(&pace_);

  options.noise_run = request_.noise_run;
  options.time_steps = true;
  RunResult result;
  {
    Progress progress(request_.verb.c_str(), request_.progress, request_.quiet);
    options.keep_going = [&](double share) {
      progress.update(share);
      return !interrupted() && !(trace_ && trace_->failed());
    };
    result.outcome = simulate(simulated, observers, options);
  }
  finish(result);
  return result;
}

void RunSession::finish(RunResult& result) {
  result.scenario = &told_;
  result.interrupted = result.outcome.stopped && interrupted();
  result.final = means_.last();
  result.mean = means_.means();
  result.drive = drive_score_.figures();
  result.plant_digest = digest_.plant();
  const auto figures = estimator_score_.figures();
  for (std::size_t i = 0; i < told_.estimators.size(); ++i) {
    const double step_ns =
        i < result.outcome.step_ns.size() ? result.outcome.step_ns[i] : std::nan("");  // none of a board
    result.estimators.push_back(
        {told_.estimators[i].name, told_.estimators[i].kind, digest_.estimator(i), figures[i], step_ns});
  }
  result.status = status_of(result);

  if (trace_) {
    trace_->finish();
    result.files.push_back(
        fmt::format("trace:  {} ({} rows, {} columns)", request_.trace, trace_->rows(), trace_->columns()));
  }
  if (figure_file_) {
    const RunOutcome& o = result.outcome;
    const std::string ended = o.diverged           ? fmt::format("DIVERGED at {} s", plain(o.diverged_at_s, 4))
                              : result.interrupted ? fmt::format("INTERRUPTED at {} s", plain(o.simulated_s, 4))
                                                   : "";
    figure_file_->write(figure_.svg(told_, figures, ended, o.events));
    figure_file_->finish();
    result.files.push_back(fmt::format("figure: {}", request_.figure));
  }
  if (stream_) {
    result.stream = stream_->finish(result.outcome.diverged  ? "diverged"
                                    : result.outcome.stopped ? "interrupted"
                                                             : "done");
    result.files.push_back(stream_line(*result.stream));
  }
}

void tell(const Request& request, const RunResult& result) {
  if (request.json) {
    print(json_document(result));
  } else if (!request.quiet) {
    print(run_summary(result));
  }
}

}  // namespace slipbench
