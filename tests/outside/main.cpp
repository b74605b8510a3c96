// Runs a scenario with an estimator of this program's own beside those of the file, and prints what each was worth.
//
//   own_estimator SCENARIO [key=value...]      the last lines are the digests, as `slipbench run --json` gives them
#include <cstdio>
#include <exception>

#include "sim/engine/simulate.hpp"
#include "sim/record/digest.hpp"
#include "sim/scenario/read.hpp"
#include "sim/score/estimator_score.hpp"
#include "voltage_model.hpp"

namespace {

int run(int count, char** words) {
  slipbench::add_estimator<slipbench::outside::VoltageModel>();  // before any scenario is read

  // One estimator more than the file has: the next free number adds one.
  const std::size_t next = slipbench::read_scenario(words[1]).estimators.size();
  const std::string own = "estimator." + std::to_string(next);
  std::vector<slipbench::Override> changes{{own + ".name", "own"}, {own + ".kind", "voltage_model"}};
  for (int n = 2; n < count; ++n) {
    const std::string word = words[n];
    const std::size_t equals = word.find('=');
    if (equals == std::string::npos) throw std::invalid_argument(word + ": wanted is key=value");
    changes.push_back({word.substr(0, equals), word.substr(equals + 1)});
  }
  const slipbench::Scenario scenario = slipbench::read_scenario(words[1], changes);

  slipbench::EstimatorScore score(slipbench::score_basis(scenario));
  slipbench::RunDigest digest;
  slipbench::RunObserver* const observers[] = {&score, &digest};
  const slipbench::RunOutcome outcome = slipbench::simulate(scenario, observers);
  if (outcome.diverged) throw std::runtime_error("diverged: " + outcome.diverged_what);

  const auto figures = score.figures();
  std::printf("%-12s %-16s %14s %12s\n", "estimator", "kind", "speed rms, rpm", "lost at, s");
  for (std::size_t e = 0; e < figures.size(); ++e) {
    const slipbench::EstimatorSettings& estimator = scenario.estimators[e];
    std::printf("%-12s %-16s %14.3f", estimator.name.c_str(), estimator.kind.c_str(),
                figures[e].speed_rmse_rpm.value_or(NAN));
    figures[e].lost_at_s ? std::printf(" %12.3f\n", *figures[e].lost_at_s) : std::printf(" %12s\n", "never");
  }
  std::printf("digest plant %s\n", digest.plant().c_str());
  for (std::size_t e = 0; e < digest.estimator_count(); ++e)
    std::printf("digest %s %s\n", scenario.estimators[e].name.c_str(), digest.estimator(e).c_str());
  return 0;
}

}  // namespace

int main(int count, char** words) {
  if (count < 2) return std::fprintf(stderr, "usage: own_estimator SCENARIO [key=value...]\n"), 2;
  try {
    return run(count, words);
  } catch (const std::exception& error) {
    return std::fprintf(stderr, "%s\n", error.what()), 2;
  }
}
