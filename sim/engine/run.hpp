// The clock of one run: at control tick k sensors, estimators and controller act, then the plant steps to tick k + 1.
//
// The voltage computed at k stands over [k + d, k + d + 1). Estimators at k get the current at k and the mean voltage
// believed applied over [k-1, k): duties times the measured DC link, less the inverter error that is compensated; on mains
// the mean of the measured voltages at k-1 and k (trapezoid: short by (w T)^2 / 12, 8e-5 at 50 Hz and 100 us).
#pragma once

#include <memory>
#include <vector>

#include "sim/engine/events.hpp"
#include "sim/engine/plant.hpp"
#include "sim/engine/ports.hpp"
#include "sim/engine/sensors.hpp"
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

  [[nodiscard]] RunInfo info() const;
  RunOutcome outcome;

 private:
  void place_at_start();
  void control_tick(std::int64_t k);
  void act(const Event& event);
  void run_estimators(std::int64_t k);
  void plant_steps(std::int64_t n, std::int64_t count);
  [[nodiscard]] Vec2<double> believed_voltage(const Reading& before, const Reading& now, std::int64_t k) const;
  [[nodiscard]] PlantRow plant_row(std::int64_t n);
  [[nodiscard]] bool find_divergence(std::int64_t k);
  [[nodiscard]] std::int64_t closing_estimator(const std::string& name) const;

  const Scenario& scenario_;
  const RunOptions& options_;
  std::int64_t first_tick_, steps_per_control_, steps_per_trace_, steps_;
  Plant plant_;
  Sensors sensors_;
  Events events_;
  std::vector<std::unique_ptr<EstimatorPort>> estimators_;
  std::unique_ptr<ControllerPort> controller_;
  std::vector<Estimate<double>> estimates_;
  std::vector<double> estimate_row_, step_seconds_;
  std::int64_t timed_ticks_ = 0;

  Modulation modulation_ = Modulation::space_vector;
  LegError<double> believed_leg_;
  bool compensated_ = false;
  std::int64_t speed_from_ = -1, flux_from_ = -1;  // estimator that closes the loop, -1: none
  Profile speed_reference_, torque_reference_;
  bool speed_control_ = true;

  std::vector<Phases<double>> pending_;  // commands not yet acting, oldest first, as a ring
  std::size_t next_pending_ = 0;
  Phases<double> duty_;  // acting over [k-1, k) when tick k begins
  Reading reading_;
  Command<double> command_;
  double speed_reference_now_ = 0.0, torque_reference_now_ = 0.0;
};

}  // namespace slipbench
