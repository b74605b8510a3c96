// Means of columns and the last row, on synthetic columns.
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "sim/score/means.hpp"

using namespace slipbench;

TEST_CASE("column means: plant, measured and estimator columns by name, over the window only", "[score][closed_form]") {
  RunInfo info;
  info.control_period_s = 0.1;
  info.trace_period_s = 0.2;
  info.duration_s = 1.0;
  info.plant = plant_columns();
  info.measured = {{"measured.i_a_A", "A", ""}};
  info.estimator_names = {"one", "two"};
  ColumnMeans means({0.2, 0.8});
  means.begin(info);
  CHECK(std::isnan(means.means().at(0).value));
  CHECK(means.last().empty());
  PlantRow plant{};
  std::vector<double> rows(2 * estimator_column_count, 0.0);
  for (int k = 0; k <= 10; ++k) {
    std::vector<Estimate<double>> estimates(2);
    plant[P::time] = 0.1 * k;
    plant[P::torque] = k;
    plant[P::speed_reference_rpm] = k == 5 ? std::numeric_limits<double>::quiet_NaN() : 1.0;
    estimates[1].speed = 3.14159265358979323846 * k;  // 30 k rpm
    estimates[1].trust = 0.5;
    means.control_tick({k, plant[P::time], &plant, estimates, false});
    if (k % 2 != 0) continue;
    const double measured = k * k;
    rows[5] = 30.0 * k;
    means.trace_row({k / 2, &plant, {&measured, 1}, rows});
  }
  const auto value = [](const std::vector<NamedValue>& all, const std::string& name) {
    for (const NamedValue& v : all) {
      if (v.name == name) return v.value;
    }
    FAIL("no column " + name);
    return 0.0;
  };
  const auto all = means.means();
  REQUIRE(all.size() == plant_column_count + 1 + 10);
  CHECK(value(all, "torque_Nm") == 5.0);                               // ticks 2..8
  CHECK(std::isnan(value(all, "speed_reference_rpm")));                // one NaN: no mean
  CHECK(value(all, "measured.i_a_A") == 30.0);                         // rows 4, 16, 36, 64
  CHECK(value(all, "two.speed_rpm") == Approx(150.0).epsilon(1e-14));  // a change of unit, two roundings a term
  CHECK(value(all, "two.trust") == 0.5);
  CHECK(value(all, "one.speed_rpm") == 0.0);
  const auto last = means.last();
  REQUIRE(last.size() == all.size());
  CHECK(value(last, "torque_Nm") == 10.0);
  CHECK(value(last, "measured.i_a_A") == 100.0);
  CHECK(value(last, "two.speed_rpm") == 300.0);
}
