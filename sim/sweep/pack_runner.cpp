#include "sim/sweep/pack_runner.hpp"

#include "sim/engine/simulate.hpp"
#include "sim/scenario/input_error.hpp"
#include "sim/score/drive_score.hpp"
#include "sim/score/estimator_score.hpp"
#include "sim/sweep/case_run.hpp"

namespace slipbench {

PackRunner::PackRunner(const std::string& isa, std::function<bool()> keep_going)
    : isa_(isa.empty() ? "double" : isa), keep_going_(std::move(keep_going)) {}

void PackRunner::run_alone(PackCase& one, std::uint32_t noise_run, const std::string& why) {
  try {
    run_case(*one.row, one.scenario, noise_run, keep_going_);
  } catch (const InputError& error) {
    fill_refused(*one.row, error.message(), 0);
  }
  simulated_s_ += one.scenario.run.duration_s;
  not_in_lanes_[why] += 1;
}

void PackRunner::run(std::vector<PackCase>& cases, std::uint32_t noise_run) {
  for (PackCase& one : cases) run_alone(one, noise_run, "asked for");
}

}  // namespace slipbench
