// Figure of a run: true, reference and estimated speed over time (means of each column of pixels); beneath, each
// estimate's error, its mean as a line within the band between its least and greatest.
#pragma once

#include <string>
#include <vector>

#include "sim/engine/events.hpp"
#include "sim/engine/observer.hpp"
#include "sim/score/basis.hpp"
#include "sim/score/figures.hpp"
#include "tools/slipbench/envelope.hpp"

namespace slipbench {

class RunFigure : public RunObserver {
 public:
  // load_steps_s: times to be marked.
  RunFigure(ScoreWindow window, std::vector<double> load_steps_s)
      : window_(window), load_steps_s_(std::move(load_steps_s)) {}
  void begin(const RunInfo& info) override;
  void control_tick(const TickView& view) override;
  // `ended` says why the run stopped early, "" if it did not; `events`: those that acted, to be marked.
  [[nodiscard]] std::string svg(const Scenario& scenario, const std::vector<EstimatorFigures>& figures,
                                const std::string& ended = "", const std::vector<ActedEvent>& events = {}) const;

 private:
  ScoreWindow window_;
  std::vector<double> load_steps_s_;
  RunInfo info_;
  Envelope truth_, reference_;
  std::vector<Envelope> estimates_, errors_;
  std::vector<std::array<double, 2>> window_error_;  // least and greatest in the score window, zero included
};

}  // namespace slipbench
