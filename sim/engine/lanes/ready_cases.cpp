#include "sim/engine/lanes/ready_cases.hpp"

#include <algorithm>
#include <new>

#include "sim/engine/lanes/run_pack.hpp"
#include "sim/engine/start.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

// Calls `make`; what it refuses stays with its case.
template <class Make>
void try_case(ReadyCase& one, Make make) {
  try {
    one.setup = make();
  } catch (const InputError& error) {
    one.refused = error.message();
  }
}

// Runs in setups of one shape, as many as there are lanes at most, and moves them to t = 0; how much each still moves.
std::vector<double> settle(const LaneSet& set, std::span<RunSetup* const> setups) {
  std::vector<const RunSetup*> filled(setups.begin(), setups.end());
  filled.resize(set.width(), setups.back());
  std::vector<double> moving(set.width());
  LanesRun run;
  run.cases = filled.data();
  run.used = setups.size();
  run.settled = setups.data();
  run.moving = moving.data();
  LanesJob job;
  job.work = LanesWork::settle;
  job.drive = &run;
  set.run(&job);
  if (run.failed) throw std::bad_alloc();
  for (RunSetup* one : setups) one->shape.first_tick = 0;
  return moving;
}

}  // namespace

std::vector<ReadyCase> ready_cases(const LaneSet& set, std::span<const Scenario* const> scenarios,
                                   std::span<const std::uint32_t> noise_runs) {
  demand_denormals();
  std::vector<ReadyCase> all(scenarios.size());
  std::vector<std::size_t> waiting;
  for (std::size_t i = 0; i < all.size(); ++i) {
    if (scenarios[i]->run.start == "steady" && lanes_can_run(*scenarios[i]).empty())
      waiting.push_back(i);
    else
      try_case(all[i], [&] { return ready_run(*scenarios[i], noise_runs[i]); });
  }
  for (const RunIn& run_in : run_ins) {
    for (const std::size_t i : waiting)
      try_case(all[i], [&] { return prepare_run(*scenarios[i], noise_runs[i], run_in.first_tick(*scenarios[i])); });
    std::erase_if(waiting, [&](std::size_t i) { return !all[i].refused.empty(); });
    std::vector<std::size_t> restless;
    while (!waiting.empty()) {
      std::vector<std::size_t> together, others;
      for (const std::size_t i : waiting) {
        const bool fits = together.size() < set.width() &&
                          (together.empty() || all[i].setup.shape == all[together.front()].setup.shape);
        (fits ? together : others).push_back(i);
      }
      std::vector<RunSetup*> pack;
      for (const std::size_t i : together) pack.push_back(&all[i].setup);
      const std::vector<double> moving = settle(set, pack);
      for (std::size_t lane = 0; lane < together.size(); ++lane) {
        if (!(moving[lane] <= run_in.allowed)) restless.push_back(together[lane]);
      }
      waiting.swap(others);
    }
    std::sort(restless.begin(), restless.end());
    waiting = restless;
  }
  for (const std::size_t i : waiting) all[i].refused = never_steady(*scenarios[i]).message();
  return all;
}

}  // namespace slipbench
