#include "sim/engine/lanes/ready_cases.hpp"

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
    one.refused = error.what();
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
    for (std::size_t first = 0; first < waiting.size();) {
      std::vector<RunSetup*> pack;
      std::size_t next = first;
      while (next < waiting.size() && pack.size() < set.width() &&
             all[waiting[next]].setup.shape == all[waiting[first]].setup.shape)
        pack.push_back(&all[waiting[next++]].setup);
      const std::vector<double> moving = settle(set, pack);
      for (std::size_t i = first; i < next; ++i) {
        if (!(moving[i - first] <= run_in.allowed)) restless.push_back(waiting[i]);
      }
      first = next;
    }
    waiting = restless;
  }
  for (const std::size_t i : waiting) all[i].refused = never_steady(*scenarios[i]).what();
  return all;
}

}  // namespace slipbench
