// Whole sweeps: the same rows whatever ran them, what failed beside what did not, stopping and going on.
#include <catch2/catch.hpp>

#include "estimators/reduced_order.hpp"
#include "sim/engine/lanes/lanes.hpp"
#include "sim/engine/own_methods.hpp"
#include "sim/scenario/input_error.hpp"
#include "sim/sweep/case_run.hpp"
#include "sim/sweep/merge.hpp"
#include "sim/sweep/sweep.hpp"
#include "tests/sim/sweep/plans.hpp"

using namespace slipbench;
using namespace sweep_tests;

namespace {

// The reduced-order observer as a program of its own would add it.
struct Twin : ReducedOrder {
  static constexpr std::string_view kind = "twin";
};
const bool added = [] {
  add_estimator<Twin>();
  return true;
}();

struct Ran {
  SweepOutcome outcome;
  std::vector<ResultRow> rows;
};

std::vector<ResultRow> rows_of(const Store& store) {
  std::vector<ResultRow> rows;
  store.each_row([&](const ResultRow& r) {
    rows.push_back(r);
    return true;
  });
  return rows;
}

Ran ran(const Folder& folder, const SweepPlan& plan, const std::string& name, const SweepOptions& options) {
  Store store(folder.file(name), origin_of(plan), columns_of(plan));
  Ran r;
  r.outcome = run_sweep(plan, store, options);
  r.rows = rows_of(store);
  return r;
}

SweepOptions with(const std::string& isa, unsigned threads = 1, Shard shard = {}) {
  SweepOptions options;
  options.isa = isa, options.threads = threads, options.shard = shard;
  return options;
}

void check_same(const std::vector<ResultRow>& a, const std::vector<ResultRow>& b) {
  REQUIRE(a.size() == b.size());
  for (std::size_t i = 0; i < a.size(); ++i) {
    INFO("row " << i << ", case " << a[i].case_number << ", run " << a[i].run);
    REQUIRE((a[i].case_number == b[i].case_number && a[i].run == b[i].run));
    CHECK(a[i].status == b[i].status);
    CHECK(a[i].message == b[i].message);
    CHECK(a[i].values == b[i].values);
    CHECK(a[i].figures == b[i].figures);  // to the bit
  }
}

// Steady starts with run-ins, structure that alternates, a flux that is kicked out of bounds, steps that do not divide.
const char* const rough_plan = R"(scenario = "scenario.toml"
runs = 2
[[vary]]
key = "process_noise.flux_Wb"
values = [0.0, 1000.0, 0.0001]
[[vary]]
key = "controller.delay_periods"
values = [1, 2]
[[vary]]
key = "run.plant_step_s"
values = [50e-6, 20e-6]
[[vary]]
key = "run.control_period_s"
values = [100e-6, 50e-6]
)";

}  // namespace

TEST_CASE("sweep: every instruction set, any number of threads and shards give the same rows", "[sweep][bits]") {
  const Folder folder;
  const SweepPlan plan = read_plan(write_plan(folder, drawn_text()));  // 70 cases: full packs and partly filled ones
  const Ran alone = ran(folder, plan, "double", with("double"));
  REQUIRE(alone.rows.size() == 70);
  CHECK(alone.outcome.in_lanes == 0);
  CHECK(alone.outcome.not_in_lanes.at("asked for") == 70);
  for (const LaneSet& set : lane_sets()) {
    const std::string name(set.name);
    if (!set.available()) {
      WARN("skipped: this processor has no " << name);
      CHECK_THROWS_AS(ran(folder, plan, name, with(name)), InputError);
      continue;
    }
    const Ran lanes = ran(folder, plan, name, with(name));
    CHECK(lanes.outcome.in_lanes == 70);
    CHECK(lanes.outcome.not_in_lanes.empty());
    CHECK(lanes.outcome.isa == name);
    CHECK(lanes.outcome.lanes == set.width());
    check_same(lanes.rows, alone.rows);
  }
  check_same(ran(folder, plan, "two", with("", 2)).rows, alone.rows);
  check_same(ran(folder, plan, "five", with("double", 5)).rows, alone.rows);
  std::vector<std::string> parts;
  std::uint64_t rows = 0;
  for (std::uint64_t i = 0; i < 3; ++i) {
    const Ran part = ran(folder, plan, "part" + std::to_string(i), with("", 2, {i, 3}));
    CHECK(part.outcome.rows == part.rows.size());
    rows += part.rows.size();
    parts.push_back(folder.file("part" + std::to_string(i)));
  }
  CHECK(rows == 70);
  Store whole(folder.file("whole"), origin_of(plan), columns_of(plan));
  CHECK(merge_stores(plan, whole, parts).missing == 0);
  check_same(rows_of(whole), alone.rows);
}

TEST_CASE("sweep: a row is what simulate() scores of its case alone", "[sweep][bits]") {
  const Folder folder;
  const SweepPlan plan = read_plan(write_plan(folder, grid_text()));
  const Ran swept = ran(folder, plan, "s", with("", 2));
  REQUIRE(swept.rows.size() == 30);
  CaseMaker maker(plan);
  for (const ResultRow& row : swept.rows) {
    ResultRow alone;
    run_case(alone, read_scenario(plan.scenario, maker.overrides(row.case_number)), row.run, {});
    CHECK(alone.status == row.status);
    CHECK(alone.figures == row.figures);
  }
  CHECK(swept.rows[0].figures != swept.rows[1].figures);  // another noise run
  CHECK(swept.rows[0].figures != swept.rows[2].figures);  // another case
}

TEST_CASE("sweep: what diverges or is refused is a row with its reason, the others are as they were", "[sweep][bits]") {
  const Folder folder;
  const SweepPlan plan = read_plan(
      write_plan(folder, rough_plan, replaced(scenario_text(), "start = \"magnetised\"", "start = \"steady\"")));
  REQUIRE(plan.cases() == 24);
  const Ran alone = ran(folder, plan, "double", with("double", 2));
  const Ran packed = ran(folder, plan, "packed", with(std::string(best_lane_set().name), 2));
  const Ran mixed = ran(folder, plan, "mixed", with("", 1));  // packs that would be too empty run alone
  check_same(packed.rows, alone.rows);
  check_same(mixed.rows, alone.rows);
  CHECK(packed.outcome.not_in_lanes.empty());
  std::map<std::string, int> status;
  for (const ResultRow& row : alone.rows) {
    status[row.status] += 1;
    CHECK((row.status == "refused") == (row.values[2] == "2e-05" && row.values[3] == "5e-05"));
    if (row.status != "refused") CHECK((row.status == "diverged") == (row.values[0] == "1000"));
    if (row.status == "refused" || row.status == "diverged") {
      INFO(row.status << ": " << row.message);
      CHECK(row.message.size() > 10);
      for (const Figure& f : row.figures) CHECK_FALSE(f);
    } else {
      CHECK(row.figures.front().has_value());
    }
    CHECK(row.figures.size() == columns_of(plan).figures.size());
  }
  INFO("done " << status["done"] << ", lost " << status["lost"] << ", diverged " << status["diverged"] << ", refused "
               << status["refused"]);
  CHECK(status["refused"] == 12);   // 50 us is no whole multiple of 20 us
  CHECK(status["diverged"] == 12);  // of the 18 cases left 6, in two runs
  CHECK(alone.outcome.refused == static_cast<std::uint64_t>(status["refused"]));
  CHECK(alone.outcome.diverged == static_cast<std::uint64_t>(status["diverged"]));
}

TEST_CASE("sweep: what lanes cannot run falls back to double, and the outcome says why", "[sweep]") {
  const Folder folder;
  const std::string kinds =
      "scenario = \"scenario.toml\"\n[[vary]]\nkey = \"estimator.0.kind\"\nvalues = [\"reduced_order\", \"twin\"]\n"
      "[[vary]]\nkey = \"belief.rotor_resistance\"\nfrom = 0.8\nto = 1.2\ncount = 8\n";
  const SweepPlan plan = read_plan(write_plan(folder, kinds));
  const Ran r = ran(folder, plan, "s", with(std::string(best_lane_set().name), 2));
  CHECK(r.outcome.in_lanes == 8);
  CHECK(r.outcome.not_in_lanes.at("an estimator from outside ('obs')") == 8);
  CHECK(r.outcome.not_in_lanes.size() == 1);
  // It is the built-in method under another name: the same figures, in double as in lanes.
  for (std::size_t i = 0; i < 8; ++i) CHECK(r.rows[i].figures == r.rows[i + 8].figures);
}

TEST_CASE("sweep: stopped at any moment it keeps what was finished, and goes on to the same rows", "[sweep][resume]") {
  const Folder folder;
  const SweepPlan plan =
      read_plan(write_plan(folder, replaced(drawn_text(), "count = 70", "count = 700"), scenario_text()));
  const Ran undisturbed = ran(folder, plan, "undisturbed", with("", 2));
  SweepOptions options = with("", 2);
  std::uint64_t before = 0;
  int calls = 0;
  for (int times = 1; times < 100; ++times) {
    int left = times;  // each time it is let go on a little longer
    options.keep_going = [&](const SweepProgress& p) {
      ++calls;
      CHECK(p.rows == 700);
      CHECK(p.done <= p.rows);
      CHECK(p.resumed == before);
      return --left > 0;
    };
    const Ran part = ran(folder, plan, "stopped", options);
    CHECK(part.rows.size() >= before);
    CHECK(part.outcome.done + before == part.rows.size());
    before = part.rows.size();
    if (!part.outcome.stopped) break;
  }
  CHECK(before == 700);
  CHECK(calls > 1);
  const Ran last = ran(folder, plan, "stopped", with("", 2));
  CHECK((last.outcome.done == 0 && last.outcome.resumed == 700));
  check_same(last.rows, undisturbed.rows);
}

TEST_CASE("sweep: a stop is heard inside a long pack and a long run alone", "[sweep][resume]") {
  const Folder folder;
  const SweepPlan plan =
      read_plan(write_plan(folder, drawn_text(), replaced(scenario_text(), "duration_s = 0.02", "duration_s = 500.0")));
  for (const char* isa : {"", "double"}) {
    SweepOptions options = with(isa, 2);
    options.keep_going = [](const SweepProgress&) { return false; };
    const Ran r = ran(folder, plan, std::string("s") + isa, options);
    CHECK(r.outcome.stopped);
    CHECK(r.rows.empty());
    CHECK(r.outcome.wall_s < 20.0);  // to its end it would take minutes
  }
}

TEST_CASE("sweep: an error of the store ends it", "[sweep]") {
  const Folder folder;
  const SweepPlan plan = read_plan(write_plan(folder, drawn_text()));
  Store store(folder.file("s"), origin_of(plan), columns_of(plan));
  SweepOptions options = with("", 2);
  options.keep_going = [](const SweepProgress&) -> bool { throw OutsideError("the screen is full"); };
  CHECK_THROWS_WITH(run_sweep(plan, store, options), "the screen is full");
}

TEST_CASE("sweep: shards of any number share out every row once", "[sweep]") {
  const Folder folder;
  const SweepPlan plan = read_plan(write_plan(folder, replaced(grid_text(), "count = 5", "count = 50")));  // 150 x 2
  for (const std::uint64_t shards : {1u, 2u, 3u, 5u, 6u, 7u, 50u}) {
    std::uint64_t rows = 0;
    for (std::uint64_t i = 0; i < shards; ++i) {
      Store store(folder.file("s" + std::to_string(shards) + "." + std::to_string(i)), origin_of(plan),
                  columns_of(plan));
      SweepOptions options = with("double", 1, {i, shards});
      std::uint64_t told = 0;
      options.keep_going = [&](const SweepProgress& p) {
        told = p.rows;
        return false;
      };
      const SweepOutcome outcome = run_sweep(plan, store, options);
      CHECK(outcome.rows == told);
      rows += outcome.rows;
    }
    CHECK(rows == 300);
  }
}
