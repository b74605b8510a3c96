// Sensitivities out of a store: the same as from the numbers themselves, whatever the order of writing; runs averaged, gaps counted.
#include <unistd.h>

#include <catch2/catch.hpp>
#include <filesystem>

#include "sim/sweep/store_sensitivity.hpp"

using namespace slipbench;

namespace {

SweepPlan plan_of(DrawKind kind, std::uint64_t count) {
  SweepPlan plan;
  plan.runs = 2;
  Sampling sample;
  sample.kind = kind, sample.count = count, sample.seed = 3;
  for (const std::vector<std::string>& keys : {std::vector<std::string>{"a"}, {"b", "c"}}) {
    DrawnKey key;
    key.keys = keys, key.low = 0.0, key.high = 1.0;
    sample.keys.push_back(key);
  }
  plan.sample = sample;
  return plan;
}

double model(const std::vector<double>& u) { return 2.0 * u[0] + u[1] * u[1]; }

// A store in a file that goes with it.
struct Kept {
  explicit Kept(const std::string& name)
      : path((std::filesystem::temp_directory_path() / (name + std::to_string(::getpid()) + ".sqlite")).string()),
        store(path, {{"format", "1"}}, {{"a", "b", "c"}, {"ekf.speed_rmse_rpm", "drive.load_dip_rpm"}}) {}
  ~Kept() { std::filesystem::remove(path); }
  Kept(const Kept&) = delete;
  Kept& operator=(const Kept&) = delete;
  std::string path;
  Store store;
};

// All rows, last case first; the two runs lie 1 above and below the model. Those that `gone` names are not written.
template <class Gone>
void fill(Store& store, const SweepPlan& plan, Gone&& gone) {
  Draws draws(plan.sample->kind, plan.sample->count, 2, plan.sample->seed);
  std::vector<ResultRow> rows;
  for (std::uint64_t k = plan.cases(); k-- > 0;) {
    for (std::uint32_t run = 0; run < 2; ++run) {
      if (gone(k, run)) continue;
      ResultRow row;
      row.case_number = k, row.run = run, row.status = "done", row.values = {"0", "0", "0"};
      row.figures = {Figure(model(draws.point(k)) + (run == 0 ? 1.0 : -1.0)), Figure()};
      rows.push_back(row);
    }
  }
  store.write(rows);
}

}  // namespace

TEST_CASE("sensitivity of a store: a Saltelli plan's as from the numbers, a lost run loses its base point",
          "[sweep][property]") {
  const SweepPlan plan = plan_of(DrawKind::saltelli, 64);
  Kept kept("slipbench-test-saltelli-");
  // Case 4 * 10 + 3 lacks its second run, base point 20 all rows, base point 63 its last case.
  fill(kept.store, plan,
       [](std::uint64_t k, std::uint32_t run) { return (k == 43 && run == 1) || k / 4 == 20 || k == 255; });
  Draws draws(DrawKind::saltelli, 64, 2, 3);
  SaltelliIndices direct(64, 2);
  for (std::uint64_t i = 0; i < 64; ++i) {
    if (i == 10 || i == 20 || i == 63) continue;
    std::vector<double> y;
    for (std::uint64_t c = 0; c < 4; ++c) {
      const double exact = model(draws.point(4 * i + c));
      y.push_back(((exact + 1.0) + (exact - 1.0)) / 2.0);  // with the rounding of the runs
    }
    direct.add(i, y);
  }
  const auto found = sensitivities_of(plan, kept.store, {"ekf.speed_rmse_rpm", "drive.load_dip_rpm"});
  REQUIRE(found.size() == 2);
  CHECK(found[0].shares.used == 61);
  CHECK(found[0].shares.lost == 3);
  const Sensitivity wanted = direct.result(3);
  REQUIRE(found[0].shares.keys.size() == 2);
  for (std::size_t j = 0; j < 2; ++j) {
    CHECK(found[0].shares.keys[j].first.value == wanted.keys[j].first.value);
    CHECK(found[0].shares.keys[j].total->low == wanted.keys[j].total->low);
  }
  CHECK(found[1].shares.lost == 64);  // no row has it
  CHECK(found[1].shares.keys.empty());
  CHECK(drawn_names(plan) == std::vector<std::string>{"a", "b+c"});
}

TEST_CASE("sensitivity of a store: plain draws' as from the numbers", "[sweep][property]") {
  for (const DrawKind kind : {DrawKind::random, DrawKind::latin_hypercube, DrawKind::sobol}) {
    const SweepPlan plan = plan_of(kind, 200);
    Kept kept("slipbench-test-plain-");
    fill(kept.store, plan, [](std::uint64_t k, std::uint32_t run) { return k == 7 || (k == 199 && run == 0); });
    Draws draws(kind, 200, 2, 3);
    BinnedIndices direct(200, 2, kind == DrawKind::sobol);
    for (std::uint64_t k = 0; k < 199; ++k) {
      const double exact = model(draws.point(k));
      if (k != 7) direct.add(k, draws.point(k), ((exact + 1.0) + (exact - 1.0)) / 2.0);
    }
    const Sensitivity found = sensitivities_of(plan, kept.store, {"ekf.speed_rmse_rpm"})[0].shares,
                      wanted = direct.result(3);
    CHECK(found.lost == 2);
    REQUIRE(found.keys.size() == 2);
    for (std::size_t j = 0; j < 2; ++j) {
      CHECK(found.keys[j].first.value == wanted.keys[j].first.value);
      CHECK(found.keys[j].first.high == wanted.keys[j].first.high);
      CHECK_FALSE(found.keys[j].total);
    }
  }
}
