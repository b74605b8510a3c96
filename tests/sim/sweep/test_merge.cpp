// Stores of shards joined: rows, doubles, gaps; mixed plans refused before a row is copied.
#include <catch2/catch.hpp>

#include "sim/scenario/input_error.hpp"
#include "sim/sweep/merge.hpp"
#include "sim/sweep/sweep.hpp"
#include "tests/sim/sweep/plans.hpp"

using namespace slipbench;
using namespace sweep_tests;

namespace {

struct Bench {
  Folder folder;
  SweepPlan plan = read_plan(write_plan(folder, grid_text()));  // 15 cases, 2 runs
  Origin origin = origin_of(plan);
  StoreColumns columns = columns_of(plan);

  [[nodiscard]] ResultRow row(std::uint64_t k, std::uint32_t run) const {
    const double x = 1.0 / (3.0 + static_cast<double>(k) + 100.0 * run);
    return {k, run, "done", "", {"0.7", "0.8", "0.8"}, std::vector<Figure>(columns.figures.size(), Figure(x))};
  }
  // A store with the rows for which `wanted` says so.
  template <class F>
  std::string part(const std::string& name, F wanted) const {
    Store store(folder.file(name), origin, columns);
    std::vector<ResultRow> rows;
    for (std::uint64_t k = 0; k < 15; ++k) {
      for (std::uint32_t run = 0; run < 2; ++run)
        if (wanted(k, run)) rows.push_back(row(k, run));
    }
    store.write(rows);
    return folder.file(name);
  }
};

}  // namespace

TEST_CASE("merge: all rows, to the bit; doubles and gaps are counted", "[sweep][merge]") {
  const Bench b;
  const std::string even = b.part("even", [](auto k, auto) { return k % 2 == 0; });
  const std::string odd = b.part("odd", [](auto k, auto) { return k % 2 == 1; });
  const std::string few = b.part("few", [](auto k, auto run) { return k < 3 && run == 0; });
  {
    Store whole(b.folder.file("whole"), b.origin, b.columns);
    const MergeOutcome outcome = merge_stores(b.plan, whole, {even, odd});
    CHECK((outcome.rows == 30 && outcome.twice == 0 && outcome.missing == 0));
    std::uint64_t seen = 0;
    whole.each_row([&](const ResultRow& r) {
      CHECK((r.case_number == seen / 2 && r.run == seen % 2));
      CHECK(r.figures == b.row(r.case_number, r.run).figures);
      ++seen;
      return true;
    });
    CHECK(seen == 30);
  }
  {
    Store whole(b.folder.file("gaps"), b.origin, b.columns);
    MergeOutcome outcome = merge_stores(b.plan, whole, {even, few});
    CHECK((outcome.rows == 17 && outcome.twice == 2 && outcome.missing == 13));
    outcome = merge_stores(b.plan, whole, {odd});
    CHECK((outcome.rows == 30 && outcome.twice == 1 && outcome.missing == 0));
  }
}

TEST_CASE("merge: a store of another plan is refused before a row is copied", "[sweep][merge]") {
  const Bench b;
  const std::string good = b.part("good", [](auto, auto) { return true; });
  Origin other = b.origin;
  for (auto& [item, text] : other)
    if (item == "scenario") text += "# later\n";
  { const Store store(b.folder.file("other"), other, b.columns); }
  Store whole(b.folder.file("whole"), b.origin, b.columns);
  try {
    merge_stores(b.plan, whole, {good, b.folder.file("other")});
    FAIL("not refused");
  } catch (const InputError& e) {
    INFO(e.what());
    CHECK(e.place() == b.folder.file("other"));
    CHECK(e.message().find("another scenario") != std::string::npos);
  }
  CHECK(whole.rows() == 0);
  CHECK_THROWS_AS(merge_stores(b.plan, whole, {b.folder.file("none")}), OutsideError);
  CHECK_THROWS_AS(merge_stores(b.plan, whole, {b.folder.write("text", std::string(999, 'x'))}), InputError);
  CHECK(whole.rows() == 0);
}

TEST_CASE("merge: a store into itself is refused", "[sweep][merge]") {
  const Bench b;
  const std::string good = b.part("good", [](auto, auto) { return true; });
  Store whole(good, b.origin, b.columns);
  CHECK_THROWS(merge_stores(b.plan, whole, {good}));
  CHECK(whole.rows() == 30);
}
