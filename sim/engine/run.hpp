// One run in double: the closed loop on its clock, with what only a single run has: timed events, step timing, observers.
#pragma once

#include <string>

#include "sim/engine/drive_loop.hpp"
#include "sim/engine/events.hpp"
#include "sim/engine/simulate.hpp"

namespace slipbench {

class Run {
 public:
  // first_tick < 0: a run-in before t = 0, for a steady start.
  Run(const Scenario& scenario, const RunOptions& options, std::int64_t first_tick);

  // Runs up to t = 0 without telling anybody; returns how much the drive still moves, as a share of its ratings.
  double run_in();
  // From t = 0 to the end.
  void go(std::span<RunObserver* const> observers);

  [[nodiscard]] const RunInfo& info() const { return setup_.info; }
  [[nodiscard]] const RunSetup& setup() const { return setup_; }
  // As the drive stands now, for another run to go on from: after a run-in, at t = 0.
  [[nodiscard]] RunSetup onward() const;
  RunOutcome outcome;

 private:
  struct Host;
  void act(const Event& event);
  void estimate();
  void control(std::int64_t k);
  void control_from_outside(std::int64_t k);
  void fill_estimate_row();
  [[nodiscard]] bool diverged(std::int64_t k);

  const RunOptions& options_;
  RunSetup setup_;
  DriveLoop<double> loop_;
  Events events_;
  std::vector<ActedEvent> noticed_;  // by the run itself
  std::vector<double> estimate_row_, step_seconds_;
  std::int64_t timed_ticks_ = 0;
};

// Reads as "... of the plant", "estimate of 'ekf', which closes the loop", ...
std::string text_of(Lost lost, const RunSetup& setup);

}  // namespace slipbench
