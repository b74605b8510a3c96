#include "sim/engine/simulate.hpp"

#include <chrono>
#include <limits>

#include "sim/engine/run.hpp"
#include "sim/engine/start.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

std::unique_ptr<Run> started(const Scenario& scenario, const RunOptions& options) {
  if (scenario.run.start != "steady") return std::make_unique<Run>(scenario, options, 0);
  for (const RunIn& run_in : run_ins) {
    auto run = std::make_unique<Run>(scenario, options, run_in.first_tick(scenario));
    const double moving = run->run_in();
    if (moving <= run_in.allowed) return run;
  }
  throw never_steady(scenario);
}

}  // namespace

// Same bits on every machine hold only where small numbers are kept; a library can switch that off for a whole thread.
void demand_denormals() {
  const volatile double least = std::numeric_limits<double>::min();
  const volatile double half = 0.5 * least;
  if (half + half != least) {
    throw OutsideError(
        "the processor is set to flush denormal numbers to zero: results would differ from machine to machine");
  }
}

RunSetup ready_run(const Scenario& scenario, std::uint32_t noise_run) {
  RunOptions options;
  options.noise_run = noise_run;
  return started(scenario, options)->onward();
}

void check_start(const Scenario& scenario) { Run(scenario, {}, 0); }

RunOutcome simulate(const Scenario& scenario, std::span<RunObserver* const> observers, const RunOptions& options) {
  demand_denormals();
  const auto run = started(scenario, options);
  const RunInfo& info = run->info();
  for (RunObserver* o : observers) o->begin(info);
  const auto begun = std::chrono::steady_clock::now();
  run->go(observers);
  run->outcome.wall_s = std::chrono::duration<double>(std::chrono::steady_clock::now() - begun).count();
  for (RunObserver* o : observers) o->end();
  return run->outcome;
}

}  // namespace slipbench
