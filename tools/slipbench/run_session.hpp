// One simulation with everything that listens to it: score, means, digest, trace, figure, stream. `run` and `board` share it.
#pragma once

#include <memory>

#include "sim/record/digest.hpp"
#include "sim/record/out_file.hpp"
#include "sim/record/trace.hpp"
#include "sim/score/drive_score.hpp"
#include "sim/score/estimator_score.hpp"
#include "tools/slipbench/options.hpp"
#include "tools/slipbench/pace.hpp"
#include "tools/slipbench/publish.hpp"
#include "tools/slipbench/run_figure.hpp"
#include "tools/slipbench/run_result.hpp"

namespace slipbench {

class RunSession {
 public:
  // Opens the outputs: a path that cannot be written costs no simulation. `told` is the scenario that all of them tell of; it and the
  // request outlive the session.
  RunSession(const Request& request, const TraceOrigin& origin, const Scenario& told);

  // Runs `simulated`, which has told's estimators (board's apart, the last), and finishes the outputs.
  RunResult run(const Scenario& simulated, RunOptions options);

 private:
  void finish(RunResult& result);

  const Request& request_;
  const Scenario& told_;
  std::unique_ptr<Trace> trace_;
  std::unique_ptr<OutFile> figure_file_;
  EstimatorScore estimator_score_;
  DriveScore drive_score_;
  ColumnMeans means_;
  RunDigest digest_;
  RunFigure figure_;
  std::unique_ptr<StreamPublisher> stream_;
  Pace pace_;
};

// Where a trace says it comes from.
TraceOrigin origin_of(const std::string& file, const std::vector<Override>& overrides, const Request& request,
                      const Scenario& scenario);
// The result on standard output, as the request wants it.
void tell(const Request& request, const RunResult& result);

}  // namespace slipbench
