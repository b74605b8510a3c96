// Student quantiles against the printed table, intervals against a worked example.
#include <catch2/catch.hpp>
#include <cmath>
#include <vector>

#include "sim/score/paired.hpp"

using namespace slipbench;

TEST_CASE("student quantile: the printed table", "[score][published]") {
  // Table of critical values of t, as in M. Abramowitz, I.A. Stegun, "Handbook of Mathematical Functions", 1964, table
  // 26.10, and any text on statistics (from memory). Three printed decimals: half a unit of the last.
  struct Row {
    double freedom, two_sided_90, two_sided_95, two_sided_99;
  };
  for (const Row& row : {Row{1, 6.314, 12.706, 63.657}, Row{2, 2.920, 4.303, 9.925}, Row{3, 2.353, 3.182, 5.841},
                         Row{4, 2.132, 2.776, 4.604}, Row{5, 2.015, 2.571, 4.032}, Row{9, 1.833, 2.262, 3.250},
                         Row{10, 1.812, 2.228, 3.169}, Row{19, 1.729, 2.093, 2.861}, Row{30, 1.697, 2.042, 2.750},
                         Row{60, 1.671, 2.000, 2.660}, Row{120, 1.658, 1.980, 2.617}}) {
    CHECK(student_quantile(0.95, row.freedom) == Approx(row.two_sided_90).epsilon(0).margin(5e-4));
    CHECK(student_quantile(0.975, row.freedom) == Approx(row.two_sided_95).epsilon(0).margin(5e-4));
    CHECK(student_quantile(0.995, row.freedom) == Approx(row.two_sided_99).epsilon(0).margin(5e-4));
    CHECK(student_quantile(0.025, row.freedom) == Approx(-student_quantile(0.975, row.freedom)).epsilon(1e-12));
  }
}

TEST_CASE("student quantile: closed forms at one and two degrees of freedom", "[score][closed_form]") {
  // n = 1 is Cauchy's: tan(pi (p - 1/2)); n = 2: (2 p - 1) sqrt(2 / (4 p (1 - p))). Exact but for rounding.
  for (const double p : {0.6, 0.75, 0.9, 0.975, 0.999}) {
    CHECK(student_quantile(p, 1) == Approx(std::tan(3.14159265358979323846 * (p - 0.5))).epsilon(1e-11));
    CHECK(student_quantile(p, 2) == Approx((2 * p - 1) * std::sqrt(2.0 / (4 * p * (1 - p)))).epsilon(1e-12));
  }
}

TEST_CASE("mean interval: a worked example", "[score][closed_form]") {
  // 1, 2, 3, 4, 5: mean 3, s^2 = 2.5, half width 2.776 sqrt(2.5 / 5) = 1.963 with the table's t(0.975, 4) = 2.776.
  const std::vector<Figure> values = {1.0, 2.0, 3.0, 4.0, 5.0};
  const Interval interval = mean_interval(values);
  CHECK(interval.runs == 5);
  CHECK(*interval.mean == 3.0);
  CHECK(*interval.high - 3.0 ==
        Approx(2.776 * std::sqrt(0.5)).epsilon(0).margin(4e-4));  // half a digit of t, times 0.71
  CHECK(3.0 - *interval.low == Approx(*interval.high - 3.0).epsilon(1e-14));
  CHECK(interval.excludes_zero());
}

TEST_CASE("mean interval: scipy's t interval of the same numbers", "[score][published]") {
  // scipy.stats.t.interval(0.95, 5, loc=mean, scale=sem) of these six numbers, SciPy 1.10.1. Its digits but the last few.
  const std::vector<Figure> values = {2.1, 3.4, 1.9, 2.8, 3.1, 1.4};
  const Interval interval = mean_interval(values);
  CHECK(*interval.low == Approx(1.6405047732952651).epsilon(1e-9));
  CHECK(*interval.high == Approx(3.2594952267047343).epsilon(1e-9));
}

TEST_CASE("intervals: runs without a number are left out, and one run alone has no interval", "[score][edge]") {
  const std::vector<Figure> a = {4.0, {}, 6.0, 5.0}, b = {1.0, 1.0, {}, 3.0};
  CHECK(mean_interval(a).runs == 3);
  CHECK(*mean_interval(a).mean == 5.0);
  const Interval d = paired_difference(a, b);  // runs 0 and 3: 3 and 2
  CHECK(d.runs == 2);
  CHECK(*d.mean == 2.5);
  CHECK(*d.high - 2.5 == Approx(12.706 * 0.5).epsilon(0).margin(3e-4));  // s / sqrt 2 = 1/2, t(0.975, 1) = 12.706
  CHECK_FALSE(d.excludes_zero());
  const std::vector<Figure> single = {7.0}, none = {Figure{}};
  CHECK(*mean_interval(single).mean == 7.0);
  CHECK_FALSE(mean_interval(single).low);
  CHECK_FALSE(mean_interval(none).mean);
}

TEST_CASE("paired difference: noise common to both cancels", "[score][property]") {
  std::vector<Figure> a, b;
  for (int r = 0; r < 10; ++r) {
    const double common = r % 2 == 0 ? 100.0 : -100.0;
    a.push_back(common + 1.0 + 0.01 * (r % 3));
    b.push_back(common);
  }
  CHECK(paired_difference(a, b).excludes_zero());
  CHECK_FALSE(mean_interval(a).excludes_zero());
  CHECK(*paired_difference(a, b).mean == Approx(-*paired_difference(b, a).mean).epsilon(1e-12));
}
