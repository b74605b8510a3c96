// The worst case of a plan: its box, its file, and beside a dense grid.
#include <unistd.h>

#include <catch2/catch.hpp>
#include <filesystem>
#include <fstream>

#include "sim/scenario/input_error.hpp"
#include "sim/scenario/tree.hpp"
#include "sim/scenario/write.hpp"
#include "sim/sweep/case_run.hpp"
#include "sim/sweep/sweep.hpp"
#include "sim/sweep/worst_case.hpp"

using namespace slipbench;
using Catch::Contains;

namespace {

namespace fs = std::filesystem;
const std::string source = SLIPBENCH_SOURCE_DIR;

struct Folder {
  Folder() : path(fs::temp_directory_path() / ("slipbench-search-" + std::to_string(::getpid()))) {
    fs::create_directories(path);
  }
  ~Folder() { fs::remove_all(path); }
  std::string write(const std::string& name, const std::string& text) const {
    std::ofstream(path / name) << text;
    return (path / name).string();
  }
  fs::path path;
};

// A tenth of a second of a shipped scenario.
const std::vector<Override> brief = {{"run.duration_s", "0.1"}, {"score.from_s", "0.02"}};

std::string plan_text(const std::string& keys) {
  return "scenario = \"" + source + "/configs/scenarios/conveyor_hot_rotor.toml\"\n" + keys;
}

std::string refusal(const Folder& folder, const std::string& keys) {
  const SweepPlan plan = read_plan(folder.write("plan.toml", plan_text(keys)));
  try {
    box_of(plan);
  } catch (const InputError& error) {
    return error.what();
  }
  FAIL("accepted");
  return "";
}

}  // namespace

TEST_CASE("worst case: the box goes from least to greatest, coupled keys are one side", "[sweep][search]") {
  const Folder folder;
  const SweepPlan grid = read_plan(folder.write("plan.toml", plan_text(R"(
[[vary]]
key = "belief.rotor_resistance"
values = [1.0, 1.5, 0.7]
[[vary]]
keys = ["belief.stator_leakage", "belief.rotor_leakage"]
from = 1.2
to = 0.8
count = 3
)")));
  const auto box = box_of(grid);
  REQUIRE(box.size() == 2);
  CHECK(box[0].low == 0.7);
  CHECK(box[0].high == 1.5);
  CHECK(box[1].keys.size() == 2);
  CHECK(box[1].low == 0.8);
  CHECK(box[1].high == 1.2);
  CHECK(box[1].at(0.0) == 0.8);
  CHECK(box[1].at(1.0) == 1.2);
  const auto drawn = box_of(read_plan(source + "/configs/sweeps/mismatch_box.toml"));
  REQUIRE(drawn.size() == 5);
  CHECK(drawn[0].low == 0.7);
  CHECK(drawn[2].low == Approx(1.0 - 3.0 * 0.07));  // normal: mean - 3 sigma
  CHECK(drawn[2].high == Approx(1.0 + 3.0 * 0.07));
}

TEST_CASE("worst case: what cannot be searched is refused at its line", "[sweep][search][contract]") {
  const Folder folder;
  CHECK_THAT(refusal(folder, "[[vary]]\nkey = \"run.method\"\nvalues = [\"rk4\", \"euler\"]\n"),
             Contains("plan.toml:3") && Contains("'rk4'") && Contains("take it out of the plan"));
  CHECK_THAT(refusal(folder, "[[vary]]\nkey = \"sensors.current.bits\"\nvalues = [10, 12]\n"),
             Contains("plan.toml:3") && Contains("holds no real number"));
  CHECK_THAT(refusal(folder, "[[vary]]\nkey = \"belief.inertia\"\nvalues = [1.0]\n"), Contains("nothing to search"));
  CHECK_THAT(refusal(folder,
                     "[sample]\nkind = \"sobol\"\ncount = 8\n[[sample.key]]\nkey = \"belief.rotor_resistance\"\n"
                     "distribution = \"normal\"\nmean = 1.0\nsigma = 0.5\n"),
             Contains("plan.toml:6") && Contains("at an end of what is searched"));
  WorstCaseOptions options;
  options.figure = "ekf.speed_rmse";
  const SweepPlan plan = read_plan(source + "/configs/sweeps/worst_resistances.toml");
  CHECK_THROWS_WITH(find_worst_case(plan, options), Contains("nearest is ekf.speed_rmse_rpm"));
}

TEST_CASE("worst case: its file stands alone and gives the figure to the bit", "[sweep][search][bits]") {
  const Folder folder;
  SweepPlan plan = read_plan(source + "/configs/sweeps/worst_resistances.toml", brief, 77);
  WorstCaseOptions options;
  options.figure = "ekf.angle_rmse_deg";
  options.budget = 20;
  const WorstCase worst = find_worst_case(plan, options);
  REQUIRE(worst.value);
  CHECK(worst.runs <= 20);
  CHECK(worst.fresh.size() == 5);
  CHECK(worst.fresh_mean.mean);
  const std::string text = scenario_text(plan, worst, options.figure, folder.path.string());
  const std::string file = folder.write("worst.toml", text);
  CHECK_THAT(text, Contains("belief.rotor_resistance") && Contains("Conveyor with a hot rotor"));
  CHECK_THAT(text, Contains("All data invented"));  // the scenario's own opening comment goes along

  const Scenario scenario = read_scenario(file);
  CHECK(scenario.seed == 77);
  ResultRow row;
  run_case(row, scenario, 0, {});
  const auto columns = figure_columns(scenario);
  const auto at = std::find(columns.begin(), columns.end(), options.figure) - columns.begin();
  CHECK(*row.figures[static_cast<std::size_t>(at)] == *worst.value);

  // Threads and lanes change nothing.
  for (const char* isa : {"", "double", "sse2"}) {
    INFO(isa);
    options.isa = isa;
    options.threads = *isa == '\0' ? 1 : 2;
    const WorstCase again = find_worst_case(plan, options);
    CHECK(again.at == worst.at);
    CHECK(again.value == worst.value);
    CHECK(again.fresh == worst.fresh);
  }
}

TEST_CASE("worst case: a run that diverges is worse than any figure", "[sweep][search]") {
  const Folder folder;
  // Forward Euler turns a rotating flux by h w and lengthens it by sqrt(1 + (h w)^2): at 50 Hz and 4 ms more than resistance damps.
  folder.write("scenario.toml",
               "[run]\nduration_s = 100.0\nplant_step_s = 4e-3\ncontrol_period_s = 4e-3\n"
               "trace_period_s = 4e-3\nmethod = \"euler\"\n[machine]\nfile = \"" +
                   source + "/configs/machines/demo_4kw.toml\"\n" +
                   "[shaft]\ninertia_kgm2 = 0.02\n[supply]\nkind = \"mains\"\nline_voltage_V = 400.0\n"
                   "frequency_Hz = 50.0\n[sensors.current]\nphases = 3\n");
  const SweepPlan plan = read_plan(folder.write(
      "plan.toml", "scenario = \"scenario.toml\"\n[[vary]]\nkey = \"supply.frequency_Hz\"\nvalues = [1.0, 50.0]\n"));
  WorstCaseOptions options;
  options.figure = "drive.peak_current_A";
  options.budget = 40;
  const WorstCase worst = find_worst_case(plan, options);
  CHECK(worst.status == "diverged");
  CHECK_THAT(worst.message, Contains(" at "));
  CHECK_FALSE(worst.value);
  CHECK(worst.runs < 40);  // it ended there
  CHECK(worst.fresh_diverged == 5);
  CHECK_FALSE(worst.fresh_mean.mean);
  CHECK_THAT(scenario_text(plan, worst, options.figure, folder.path.string()), Contains("DIVERGED"));
}

TEST_CASE("nodes as TOML: every shipped scenario reads back as the same nodes", "[scenario][contract]") {
  const auto same = [](const auto& self, const Node& a, const Node& b) -> bool {
    if (a.kind != b.kind || a.name != b.name || a.text != b.text || a.whole != b.whole || a.real != b.real ||
        a.truth != b.truth || a.children.size() != b.children.size())
      return false;
    if (a.kind != Node::Kind::table) {
      for (std::size_t i = 0; i < a.children.size(); ++i) {
        if (!self(self, a.children[i], b.children[i])) return false;
      }
      return true;
    }
    for (const Node& child : a.children) {  // the order of a table's keys means nothing
      const Node* other = b.child(child.name);
      if (other == nullptr || !self(self, child, *other)) return false;
    }
    return true;
  };
  std::vector<std::string> texts = {
      "a = 5.0\nb = 1e30\nc = [[1, 2.5], [\"x\\\"y\\n\\u0001\", true]]\n\"odd key\" = -inf\nt = {u = 1, v = [{w = 2}, "
      "3]}\n"
      "[p.q]\nr = 1\n[[l]]\n[[l]]\nm = 1\n[[l.n]]\no = 9007199254740993\n[[l.n]]\n"};
  for (const auto& entry : fs::directory_iterator(source + "/configs/scenarios")) {
    std::string why;
    texts.push_back(*read_text(entry.path().string(), why));
  }
  REQUIRE(texts.size() > 10);
  for (const std::string& text : texts) {
    const Node before = parse_toml(text, "before");
    const std::string written = toml_text(before);
    INFO(written);
    CHECK(same(same, before, parse_toml(written, "after")));
  }
}

TEST_CASE("worst case: within 2 % of a dense grid's worst at a tenth of the runs", "[sweep][search][long]") {
  const Folder folder;
  const SweepPlan plan = read_plan(source + "/configs/sweeps/worst_resistances.toml");
  REQUIRE(plan.cases() == 441);
  Store store((folder.path / "grid.sqlite").string(), origin_of(plan), columns_of(plan));
  const SweepOutcome grid = run_sweep(plan, store, {});
  REQUIRE(grid.done == 441);
  // One in a corner, one within a side of the box (rotor resistance about 1.5), one per method.
  for (const char* figure : {"ekf.speed_rmse_rpm", "reduced.flux_rmse_Wb", "luenberger.torque_rmse_Nm"}) {
    INFO(figure);
    WorstCaseOptions options;
    options.figure = figure;
    options.budget = 44;
    const WorstCase worst = find_worst_case(plan, options);
    const auto at = std::find(store.columns().figures.begin(), store.columns().figures.end(), figure);
    const auto column = static_cast<std::size_t>(at - store.columns().figures.begin());
    const double dense = *store.largest(figure, 1).front().figures[column];
    REQUIRE(worst.value);
    WARN(figure << ": search " << *worst.value << " in " << worst.runs << " runs, grid " << dense << " in 441");
    CHECK(worst.runs <= 44);
    CHECK(*worst.value >= 0.98 * dense);  // what the README promises
  }
}
