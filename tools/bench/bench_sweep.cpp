// A whole sweep of 128 cases (conveyor, luenberger and extended_kalman, scored, into a store): double on one thread, packs on one, packs
// on two, in turns.
//
//   lanes     time of double over that of packs, one thread each
//   threads   packs on one thread over packs on two
//   whole     double on one thread over packs on two
// What threads leaves to two is parted in two, threads = 2 busy even:
//   busy      share of the two threads' time in which they work
//   even      processor time of the work on one thread over that on two: what the two take from each other in the machine
// Of each, the best of the turns: what disturbs only ever adds.
#include <benchmark/benchmark.h>
#include <sys/resource.h>
#include <unistd.h>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <sstream>
#include <stdexcept>
#include <string>

#include "sim/engine/lanes/lanes.hpp"
#include "sim/sweep/sweep.hpp"

namespace {

using namespace slipbench;
namespace fs = std::filesystem;

// A folder of its own with the plan; it goes at the end.
struct Workplace {
  fs::path folder = fs::temp_directory_path() / ("slipbench-bench-sweep-" + std::to_string(::getpid()));
  Workplace() {
    fs::create_directories(folder);
    std::stringstream text;
    text << std::ifstream(SLIPBENCH_SOURCE_DIR "/configs/scenarios/conveyor_hot_rotor.toml").rdbuf();
    std::string scenario = text.str();
    const auto replace = [&](const std::string& what, const std::string& by) {
      const std::size_t at = scenario.find(what);
      if (at == std::string::npos) throw std::runtime_error("the conveyor has no '" + what + "'");
      scenario.replace(at, what.size(), by);
    };
    replace("[[estimator]]\nname = \"reduced\"\nkind = \"reduced_order\"\n", "");
    replace("../machines", SLIPBENCH_SOURCE_DIR "/configs/machines");
    std::ofstream(folder / "scenario.toml") << scenario;
    std::ofstream(folder / "plan.toml") << "scenario = \"scenario.toml\"\n[[vary]]\nkey = \"belief.rotor_resistance\"\n"
                                           "from = 0.7\nto = 1.3\ncount = 128\n";
  }
  ~Workplace() { fs::remove_all(folder); }
  [[nodiscard]] std::string file(const char* name) const { return (folder / name).string(); }
};

double processor_seconds() {
  rusage used{};
  ::getrusage(RUSAGE_SELF, &used);
  const auto of = [](const timeval& t) {
    return static_cast<double>(t.tv_sec) + 1e-6 * static_cast<double>(t.tv_usec);
  };
  return of(used.ru_utime) + of(used.ru_stime);
}

struct Best {
  double wall_s = 1e300, processor_s = 1e300;
};

void sweep(Best& best, const Workplace& place, const SweepPlan& plan, const std::string& isa, unsigned threads) {
  fs::remove(place.file("rows.sqlite"));
  Store store(place.file("rows.sqlite"), origin_of(plan), columns_of(plan));
  SweepOptions options;
  options.isa = isa;
  options.threads = threads;
  const double begun = processor_seconds();
  best.wall_s = std::min(best.wall_s, run_sweep(plan, store, options).wall_s);
  best.processor_s = std::min(best.processor_s, processor_seconds() - begun);
}

void whole_sweep(benchmark::State& state) {
  const Workplace place;
  const SweepPlan plan =
      read_plan(place.file("plan.toml"), {{"run.duration_s", "2.0"},
                                          {"run.start", "magnetised"},
                                          {"reference.speed_rpm", "[[0.0, 0.0], [0.02, 0.0], [0.3, 300.0]]"},
                                          {"score.from_s", "0.05"}});
  Best single, packs, both;
  for (auto _ : state) {
    sweep(single, place, plan, "double", 1);
    sweep(packs, place, plan, "", 1);
    sweep(both, place, plan, "", 2);
  }
  state.SetLabel(std::string(best_lane_set().name));
  state.counters["lanes"] = single.wall_s / packs.wall_s;
  state.counters["threads"] = packs.wall_s / both.wall_s;
  state.counters["whole"] = single.wall_s / both.wall_s;
  state.counters["busy"] = both.processor_s / (2.0 * both.wall_s);
  state.counters["even"] = packs.processor_s / both.processor_s;
}

BENCHMARK(whole_sweep)->Unit(benchmark::kMillisecond)->Iterations(5);

}  // namespace

BENCHMARK_MAIN();
