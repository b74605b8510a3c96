// Plans as they should be: what is read, and the cases they make.
#include <catch2/catch.hpp>
#include <cmath>
#include <map>

#include "sim/sweep/plan.hpp"
#include "sim/sweep/sweep.hpp"
#include "tests/sim/sweep/plans.hpp"

using namespace slipbench;
using namespace sweep_tests;

namespace {

std::map<std::string, std::string> case_of(const SweepPlan& plan, std::uint64_t k) {
  std::map<std::string, std::string> found;
  for (const Override& o : CaseMaker(plan).overrides(k)) found[o.key] = o.value;
  return found;
}

}  // namespace

TEST_CASE("plan: grids cross, the last fastest, ends exact, coupled keys together", "[sweep][plan]") {
  const Folder folder;
  const SweepPlan plan = read_plan(write_plan(folder, grid_text()));
  CHECK(plan.title == "grid");
  CHECK(plan.runs == 2);
  REQUIRE(plan.cases() == 15);
  const std::string rotor = "belief.rotor_resistance", a = "belief.stator_leakage", b = "belief.rotor_leakage";
  CHECK(plan.keys() == std::vector<std::string>{rotor, a, b});
  CaseMaker maker(plan);
  for (std::uint64_t k = 0; k < 15; ++k) {
    const std::vector<Override> o = maker.overrides(k);
    REQUIRE(o.size() == 3);
    CHECK(o[0].value == (k < 5 ? "0.7" : k < 10 ? "1" : "1.5"));
    CHECK(o[1].value == o[2].value);
    CHECK(std::stod(o[1].value) == Approx(0.8 + 0.1 * static_cast<double>(k % 5)).epsilon(1e-15));
  }
  CHECK(maker.overrides(0)[1].value == "0.8");
  CHECK(maker.overrides(4)[1].value == "1.2");
  CHECK_THROWS_AS(maker.overrides(15), std::out_of_range);
}

TEST_CASE("plan: a range falls as well as rises, and meets awkward ends to the bit", "[sweep][plan]") {
  const Folder folder;
  const SweepPlan plan = read_plan(write_plan(folder, R"(scenario = "scenario.toml"
[[vary]]
key = "belief.rotor_resistance"
from = 1.3000000000000003
to = 0.1
count = 7
)"));
  CHECK(plan.varies[0].values.front() == "1.3000000000000003");
  CHECK(plan.varies[0].values.back() == "0.1");
  for (std::size_t i = 1; i < 7; ++i)
    CHECK(std::stod(plan.varies[0].values[i]) < std::stod(plan.varies[0].values[i - 1]));
}

TEST_CASE("plan: words, truths and structural keys vary too", "[sweep][plan]") {
  const Folder folder;
  const SweepPlan plan = read_plan(write_plan(folder, R"(scenario = "scenario.toml"
[[vary]]
key = "estimator.0.kind"
values = ["luenberger", "reduced_order"]
[[vary]]
key = "controller.dead_time_compensation"
values = [true, false]
[[vary]]
key = "run.plant_step_s"
values = [50e-6, 25e-6]
)"));
  REQUIRE(plan.cases() == 8);
  CHECK(case_of(plan, 0)["estimator.0.kind"] == "luenberger");
  CHECK(case_of(plan, 7)["estimator.0.kind"] == "reduced_order");
  CHECK(case_of(plan, 2)["controller.dead_time_compensation"] == "false");
  const Scenario last = scenario_of(plan).read(CaseMaker(plan).overrides(7));
  CHECK(last.estimators[0].kind == "reduced_order");
  CHECK(last.run.plant_step_s == 25e-6);
  CHECK_FALSE(last.controller.dead_time_compensation);
}

TEST_CASE("plan: a string stays the string that it is", "[sweep][plan]") {
  const Folder folder;
  const SweepPlan plan = read_plan(write_plan(folder, R"(scenario = "scenario.toml"
[[vary]]
key = "title"
values = ["plain", "1.0", "true", "\"quoted\"", "a\\b, c # d\tµ", "", "2026-01-01"]
)"));
  const std::vector<std::string> wanted = {"plain", "1.0", "true", "\"quoted\"", "a\\b, c # d\tµ", "", "2026-01-01"};
  for (std::size_t k = 0; k < wanted.size(); ++k)
    CHECK(scenario_of(plan).read(CaseMaker(plan).overrides(k)).title == wanted[k]);
}

TEST_CASE("plan: draws take their seed from plan, command line, scenario, in this order", "[sweep][plan]") {
  const Folder folder;
  const SweepPlan plan = read_plan(write_plan(folder, drawn_text()));
  REQUIRE(plan.sample);
  CHECK(plan.cases() == 70);
  CHECK(plan.sample->seed == 3);
  double low = 2.0, high = 0.0;
  for (std::uint64_t k = 0; k < 70; ++k) {
    auto values = case_of(plan, k);
    CHECK(values["belief.stator_leakage"] == values["belief.rotor_leakage"]);
    const double x = std::stod(values["belief.rotor_resistance"]);
    low = std::min(low, x), high = std::max(high, x);
  }
  // 70 strata of width 0.01: the ends are met within one.
  CHECK((low > 0.7 && low < 0.71 && high > 1.39 && high < 1.4));
  const std::string unseeded = folder.write("unseeded.toml", replaced(drawn_text(), "seed = 3\n", ""));
  CHECK(read_plan(unseeded).sample->seed == 5);
  CHECK(read_plan(unseeded, {}, 9).sample->seed == 9);
  CHECK(read_plan(unseeded, {{"seed", "8"}}).sample->seed == 8);
  CHECK(read_plan(folder.file("plan.toml"), {}, 9).sample->seed == 3);
  const SweepPlan design = read_plan(folder.write("s.toml", replaced(drawn_text(), "latin_hypercube", "saltelli")));
  CHECK(design.cases() == 70 * 4);
}

TEST_CASE("plan: --set reaches the plan with 'plan.' before it, the scenario without", "[sweep][plan]") {
  const Folder folder;
  const std::string path = write_plan(folder, grid_text());
  const SweepPlan plan = read_plan(
      path,
      {{"plan.runs", "3"}, {"plan.vary.0.values", "[0.9]"}, {"plan.vary.1.count", "2"}, {"shaft.inertia_kgm2", "0.05"}},
      4);
  CHECK(plan.runs == 3);
  CHECK(plan.cases() == 2);
  const Scenario s = scenario_of(plan).read(CaseMaker(plan).overrides(1), plan.seed);
  CHECK(s.shaft.inertia_kgm2 == 0.05);
  CHECK(s.belief.rotor_resistance == 0.9);
  CHECK(s.belief.rotor_leakage == 1.2);
  CHECK(s.seed == 4);
}

TEST_CASE("plan: one that varies nothing is one case of many noise runs", "[sweep][plan]") {
  const Folder folder;
  const SweepPlan plan = read_plan(write_plan(folder, "scenario = \"scenario.toml\"\nruns = 20\n"));
  CHECK(plan.cases() == 1);
  CHECK(plan.keys().empty());
  CHECK(CaseMaker(plan).overrides(0).empty());
}

TEST_CASE("plan: machine files that vary are part of what a store was made from", "[sweep][plan]") {
  const Folder folder;
  folder.write("other.toml", replaced(machine_text(), "1.25", "1.5"));
  const SweepPlan plan = read_plan(write_plan(folder, R"(scenario = "scenario.toml"
[[vary]]
key = "machine.file"
values = ["machine.toml", "other.toml"]
)"));
  const Origin before = origin_of(plan);
  folder.write("other.toml", replaced(machine_text(), "1.25", "1.6"));
  CHECK(origin_of(plan) != before);
}

TEST_CASE("plan: the working folder is no part of what a store was made from", "[sweep][plan]") {
  const Folder folder;
  const std::string path = write_plan(folder, grid_text());
  const Origin absolute = origin_of(read_plan(path));
  const fs::path here = fs::current_path();
  fs::current_path(fs::path(path).parent_path());
  const Origin relative = origin_of(read_plan("plan.toml"));
  fs::current_path(here);
  CHECK(relative == absolute);
}

TEST_CASE("plan: ranges of the largest count are read at once", "[sweep][plan]") {
  const Folder folder;
  const SweepPlan plan = read_plan(
      write_plan(folder, replaced(replaced(grid_text(), "count = 5", "count = 1000000"), "[0.7, 1.0, 1.5]", "[1.0]")));
  CHECK(plan.cases() == 1'000'000);
  CHECK(case_of(plan, 999'999)["belief.rotor_leakage"] == "1.2");
}

TEST_CASE("plan: every shipped one reads", "[sweep][plan]") {
  int found = 0;
  for (const auto& entry : fs::directory_iterator(SLIPBENCH_SOURCE_DIR "/configs/sweeps")) {
    if (entry.path().extension() != ".toml") continue;
    ++found;
    INFO(entry.path().string());
    CHECK(read_plan(entry.path().string()).cases() > 1);
  }
  CHECK(found > 1);
}
