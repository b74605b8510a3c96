// One run of a scenario, start to end: builds plant, sensors, controller and estimators, steps them on integer ticks and
// tells the observers.
#pragma once

#include <cstdint>
#include <functional>
#include <span>
#include <string>
#include <vector>

#include "sim/engine/events.hpp"
#include "sim/engine/observer.hpp"
#include "sim/engine/outside.hpp"
#include "sim/engine/setup.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

struct RunOptions {
  std::uint32_t noise_run = 0;                  // r: another draw of every noise, same seed
  std::function<bool(double done)> keep_going;  // called now and then with the share done; false stops the run
  bool time_steps = false;                      // measure each estimator's step (step_ns); costs a clock read a tick
  OutsideController* outside = nullptr;         // takes the controller's place; no steady start, no mains
};

struct RunOutcome {
  bool diverged = false, stopped = false;
  double diverged_at_s = 0.0;
  std::string diverged_what;  // "stator flux of the plant", "estimate of 'ekf', which closes the loop", ...
  double simulated_s = 0.0, wall_s = 0.0;  // wall_s leaves start-up out
  std::int64_t clipped_samples = 0;        // ADC readings at the end of their range
  std::vector<ActedEvent> events;          // that acted, in order
  std::vector<double> step_ns;             // mean wall time of each estimator's step, in file order; none of `board`
};

// Throws InputError where the scenario can't be run (no equilibrium for start = "steady", ...), OutsideError where the
// processor flushes denormals; the loop itself never throws: divergence is found at the control tick where it shows and
// ends the run.
RunOutcome simulate(const Scenario& scenario, std::span<RunObserver* const> observers, const RunOptions& options = {});

// A run at t = 0, set up (a steady start run in) but not begun: what packs of lanes are filled with. Built-in methods only.
// Throws as simulate() does.
RunSetup ready_run(const Scenario& scenario, std::uint32_t noise_run = 0);

// Throws OutsideError where the processor flushes denormals.
void demand_denormals();

// Sets the run up and goes no further: throws what simulate() would throw before its first tick, a run-in apart.
void check_start(const Scenario& scenario);

}  // namespace slipbench
