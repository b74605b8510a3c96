// Cases of a sweep side by side: a closed-loop drive with two estimators, scored; packs of lanes against one case after
// another in double, in turns on one thread.
//
//   packs/SET     `ratio`: median time a case in double over that in packs; `bare`: packs without scores, as a share of it
#include <benchmark/benchmark.h>

#include <algorithm>
#include <chrono>
#include <string>
#include <vector>

#include "sim/engine/lanes/run_pack.hpp"
#include "sim/scenario/read.hpp"
#include "sim/score/drive_score.hpp"
#include "sim/score/estimator_score.hpp"
#include "sim/score/pack_score.hpp"

namespace {

using namespace slipbench;

constexpr std::size_t case_count = 64;

// The conveyor with luenberger and extended_kalman, cut to 0.3 s, rotor resistance believed wrong by up to a third.
std::vector<Scenario> cases() {
  const ScenarioFile file(SLIPBENCH_SOURCE_DIR "/configs/scenarios/conveyor_hot_rotor.toml");
  std::vector<Scenario> all;
  for (std::size_t i = 0; i < case_count; ++i) {
    Scenario s = file.read({{"belief.rotor_resistance", std::to_string(0.7 + 0.01 * static_cast<double>(i))},
                            {"run.duration_s", "0.3"},
                            {"run.start", "magnetised"},
                            {"reference.speed_rpm", "[[0.0, 0.0], [0.02, 0.0], [0.2, 200.0]]"},
                            {"score.from_s", "0.05"}});
    s.estimators.erase(s.estimators.begin() + 1);
    all.push_back(s);
  }
  return all;
}

double now() { return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count(); }
double median(std::vector<double> x) {
  std::nth_element(x.begin(), x.begin() + static_cast<std::ptrdiff_t>(x.size() / 2), x.end());
  return x[x.size() / 2];
}

struct Scored {
  EstimatorScore estimators;
  DriveScore drive;
  explicit Scored(const Scenario& s) : estimators(score_basis(s)), drive(score_basis(s)) {}
};

double alone(const Scenario& s) {
  const double begun = now();
  Scored score(s);
  RunObserver* observers[] = {&score.estimators, &score.drive};
  simulate(s, observers);
  benchmark::DoNotOptimize(score.drive.figures());
  return now() - begun;
}

double in_pack(const LaneSet& set, const Scenario* first, bool scored) {
  const double begun = now();
  std::vector<RunSetup> setups;
  std::vector<ScoreBasis> bases;
  std::vector<const RunSetup*> pack;
  for (std::size_t i = 0; i < set.width(); ++i) {
    setups.push_back(ready_run(first[i]));
    bases.push_back(score_basis(first[i]));
  }
  for (const auto& setup : setups) pack.push_back(&setup);
  PackScore score(bases, first->estimators.size());
  PackObserver nobody;
  run_pack(set, pack, scored ? static_cast<PackObserver&>(score) : nobody);
  return (now() - begun) / static_cast<double>(set.width());
}

void packs(benchmark::State& state, const LaneSet& set) {
  if (!set.available()) {
    state.SkipWithError("this processor lacks the instruction set");
    return;
  }
  const std::vector<Scenario> all = cases();
  std::vector<double> single, packed, bare;
  for (auto _ : state) {
    for (std::size_t i = 0; i + set.width() <= all.size(); i += set.width()) {
      single.push_back(alone(all[i]));
      packed.push_back(in_pack(set, &all[i], true));
      bare.push_back(in_pack(set, &all[i], false));
    }
  }
  state.counters["lanes"] = static_cast<double>(set.width());
  state.counters["double_ms"] = 1e3 * median(single);
  state.counters["packed_ms"] = 1e3 * median(packed);
  state.counters["ratio"] = median(single) / median(packed);
  state.counters["bare"] = median(bare) / median(packed);
}

}  // namespace

int main(int argc, char** argv) {
  for (const auto& set : slipbench::lane_sets()) {
    benchmark::RegisterBenchmark(("packs/" + std::string(set.name)).c_str(),
                                 [&set](benchmark::State& state) { packs(state, set); })
        ->Unit(benchmark::kMillisecond)
        ->Iterations(3);
  }
  benchmark::Initialize(&argc, argv);
  if (benchmark::ReportUnrecognizedArguments(argc, argv)) return 2;
  benchmark::RunSpecifiedBenchmarks();
}
