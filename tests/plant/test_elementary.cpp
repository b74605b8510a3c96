// Own elementary functions against libquadmath (113 bits): the error bounds that elementary.hpp states hold on random and
// edge points of their domains. The exact result is rounded from 113 bits, whose own error (under 1e-9 ulp) does not count.
#include <quadmath.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <random>
#include <string>

#include "plant/math/elementary.hpp"

namespace {

namespace sb = slipbench;
const __float128 pi_exact = acosq(-1);

template <class T>
struct Domain;
template <>
struct Domain<double> {
  static constexpr double angle = 1e6, turns = 0x1p49, exponent = 750.0, magnitude = 1000.0;
};
template <>
struct Domain<float> {
  static constexpr double angle = 6000.0, turns = 0x1p20, exponent = 105.0, magnitude = 120.0;
};

// Error in units of the spacing of T at the exact value.
template <class T>
double ulps(T got, __float128 exact) {
  const T nearest = static_cast<T>(exact);
  if (std::isinf(nearest) || std::isinf(got)) return got == nearest ? 0.0 : 1e30;
  int exponent = 0;
  (void)frexpq(exact, &exponent);
  exponent = std::max(exponent, std::numeric_limits<T>::min_exponent);
  const __float128 spacing = ldexpq(1, exponent - std::numeric_limits<T>::digits);
  return static_cast<double>(fabsq((static_cast<__float128>(got) - exact) / spacing));
}

struct Worst {
  double ulp = 0.0, at = 0.0;
  void see(double error, double where) {
    if (!(error <= ulp)) ulp = error, at = where;  // a NaN shows, too
  }
};

// Points of both signs with sizes spread evenly over `octaves` powers of two below `top`.
template <class T>
class Spread {
 public:
  Spread(double top, double octaves) : top_(top), octaves_(octaves) {}
  T operator()() {
    const double size = top_ * std::exp2(-octaves_ * unit_(bits_));
    return static_cast<T>(unit_(bits_) < 0.5 ? -size : size);
  }
  double unit() { return unit_(bits_); }

 private:
  std::mt19937_64 bits_{12345};
  std::uniform_real_distribution<double> unit_{0.0, 1.0};
  double top_, octaves_;
};

constexpr int count = 40000;

template <class T>
void see_sincos(Worst& sine, Worst& cosine, T x) {
  const auto y = sb::sincos(x);
  sine.see(ulps(y.sin, sinq(x)), static_cast<double>(x));
  cosine.see(ulps(y.cos, cosq(x)), static_cast<double>(x));
}

}  // namespace

TEMPLATE_TEST_CASE("sincos: within 2 ulp over its domain, next to multiples of pi/2 too", "[plant][elementary]", double,
                   float) {
  Worst sine, cosine;
  Spread<TestType> points(Domain<TestType>::angle, 30.0);
  for (int i = 0; i < count; ++i) {
    see_sincos(sine, cosine, points());
    // The reduction's hard cases: the numbers nearest to n pi/2, and their neighbours.
    const double n = std::floor(points.unit() * Domain<TestType>::angle / 1.6);
    const auto x = static_cast<TestType>(n * (pi_exact / 2));
    for (TestType y : {x, std::nextafter(x, TestType(0)), std::nextafter(x, TestType(1e30))})
      see_sincos(sine, cosine, y);
  }
  INFO("sine worst at " << sine.at << ", cosine worst at " << cosine.at);
  CHECK(sine.ulp <= 2.0);
  CHECK(cosine.ulp <= 2.0);
}

TEMPLATE_TEST_CASE("sincos_turns: within 2 ulp, whole turns exact", "[plant][elementary]", double, float) {
  Worst sine, cosine;
  Spread<TestType> points(Domain<TestType>::turns, 60.0);
  for (int i = 0; i < count; ++i) {
    const TestType turns = points();
    // Exact reduction in 113 bits: to an eighth of a turn and whole quarters.
    const __float128 fraction = static_cast<__float128>(turns) - floorq(turns);
    const __float128 quarters = rintq(4 * fraction), rest = 2 * pi_exact * (fraction - quarters / 4);
    const int quadrant = static_cast<int>(quarters) & 3;
    const __float128 s = sinq(rest), c = cosq(rest);
    const __float128 exact_sin[] = {s, c, -s, -c}, exact_cos[] = {c, -s, -c, s};
    const auto y = sb::sincos_turns(turns);
    sine.see(ulps(y.sin, exact_sin[quadrant]), static_cast<double>(turns));
    cosine.see(ulps(y.cos, exact_cos[quadrant]), static_cast<double>(turns));
  }
  INFO("sine worst at " << sine.at << ", cosine worst at " << cosine.at);
  CHECK(sine.ulp <= 2.0);
  CHECK(cosine.ulp <= 2.0);
  for (TestType whole : {TestType(0), TestType(1), TestType(-3), TestType(100000)}) {
    const auto at = sb::sincos_turns(whole), quarter = sb::sincos_turns(whole + TestType(0.25));
    CHECK((at.sin == TestType(0) && at.cos == TestType(1)));
    CHECK((quarter.sin == TestType(1) && quarter.cos == TestType(0)));
  }
}

TEMPLATE_TEST_CASE("atan2: within 2 ulp all round", "[plant][elementary]", double, float) {
  Worst worst;
  Spread<TestType> points(std::sqrt(static_cast<double>(std::numeric_limits<TestType>::max())), 3.0), near(1.0, 60.0);
  for (int i = 0; i < count; ++i) {
    const TestType x = points(), y = points();
    worst.see(ulps(sb::atan2(y, x), atan2q(y, x)), static_cast<double>(y / x));
    const TestType little = near() * x;  // near the axes
    worst.see(ulps(sb::atan2(little, x), atan2q(little, x)), static_cast<double>(little / x));
    worst.see(ulps(sb::atan2(x, little), atan2q(x, little)), static_cast<double>(x / little));
    const auto edge =
        static_cast<TestType>((points.unit() < 0.5 ? 1.0 : 0.5) * (0.99 + 0.02 * points.unit()));  // reductions
    worst.see(ulps(sb::atan2(edge * x, x), atan2q(edge * x, x)), static_cast<double>(edge));
  }
  INFO("worst at y/x = " << worst.at);
  CHECK(worst.ulp <= 2.0);
  CHECK(sb::atan2(TestType(0), TestType(0)) == TestType(0));
  CHECK(sb::atan2(TestType(0), TestType(-2)) == static_cast<TestType>(pi_exact));
  CHECK(sb::atan2(TestType(-3), TestType(0)) == static_cast<TestType>(-(pi_exact / 2)));
}

TEMPLATE_TEST_CASE("exp: within 1.5 ulp, overflow and gradual underflow included", "[plant][elementary]", double,
                   float) {
  Worst worst;
  Spread<TestType> points(Domain<TestType>::exponent, 30.0);
  for (int i = 0; i < count; ++i) {
    const TestType x = points(), y = static_cast<TestType>((2.0 * points.unit() - 1.0) * Domain<TestType>::exponent);
    worst.see(ulps(sb::exp(x), expq(x)), static_cast<double>(x));
    worst.see(ulps(sb::exp(y), expq(y)), static_cast<double>(y));
  }
  INFO("worst at " << worst.at);
  CHECK(worst.ulp <= 1.5);
  const auto infinity = std::numeric_limits<TestType>::infinity();
  CHECK(sb::exp(TestType(0)) == TestType(1));
  CHECK(sb::exp(infinity) == infinity);
  CHECK(sb::exp(-infinity) == TestType(0));
}

TEMPLATE_TEST_CASE("log: within 1 ulp from the smallest to the largest number", "[plant][elementary]", double, float) {
  using Limits = std::numeric_limits<TestType>;
  Worst worst;
  Spread<TestType> points(1.0, 1.0);
  for (int i = 0; i < count; ++i) {
    const auto x = static_cast<TestType>(std::exp2((2.0 * points.unit() - 1.0) * Domain<TestType>::magnitude));
    const auto y =
        static_cast<TestType>(1.0 + (points.unit() - 0.5) * std::exp2(-20.0 * points.unit()));  // near its zero
    for (TestType z : {x, y}) worst.see(ulps(sb::log(z), logq(z)), static_cast<double>(z));
  }
  for (TestType z : {Limits::denorm_min(), Limits::min(), Limits::max(), std::nextafter(Limits::min(), TestType(0))}) {
    worst.see(ulps(sb::log(z), logq(z)), static_cast<double>(z));
  }
  INFO("worst at " << worst.at);
  CHECK(worst.ulp <= 1.0);
  CHECK(sb::log(TestType(1)) == TestType(0));
  CHECK(sb::log(TestType(0)) == -Limits::infinity());
  CHECK(sb::log(Limits::infinity()) == Limits::infinity());
  CHECK(std::isnan(sb::log(TestType(-1))));
}

TEMPLATE_TEST_CASE("wrap_angle: within 1.5 ulp of pi, in [-pi, pi), unchanged inside", "[plant][elementary]", double,
                   float) {
  const auto pi = static_cast<TestType>(pi_exact);
  const __float128 ulp_of_pi = ldexpq(1, 2 - std::numeric_limits<TestType>::digits);
  Worst worst;
  bool in_range = true;
  Spread<TestType> points(Domain<TestType>::angle, 22.0);
  for (int i = 0; i < count; ++i) {
    const auto turns = static_cast<TestType>(std::floor(points.unit() * 900.0) * pi_exact);
    for (TestType x : {points(), turns, std::nextafter(turns, TestType(0)), -turns}) {
      const TestType wrapped = sb::wrap_angle(x);
      in_range = in_range && wrapped >= -pi && wrapped < pi;
      // The difference to the exact remainder, itself taken round the circle at the seam.
      const __float128 off = remainderq(static_cast<__float128>(wrapped) - static_cast<__float128>(x), 2 * pi_exact);
      worst.see(static_cast<double>(fabsq(off) / ulp_of_pi), static_cast<double>(x));
    }
  }
  INFO("worst at " << worst.at);
  CHECK(worst.ulp <= 1.5);
  CHECK(in_range);
  CHECK(sb::wrap_angle(pi) == -pi);
  for (TestType x : {-pi, TestType(-1), TestType(0), TestType(1e-30), std::nextafter(pi, TestType(0))})
    CHECK(sb::wrap_angle(x) == x);
}

TEMPLATE_TEST_CASE("elementary functions: NaN in, NaN out", "[plant][elementary]", double, float) {
  const auto nan = std::numeric_limits<TestType>::quiet_NaN();
  const TestType one(1);
  CHECK(std::isnan(sb::sincos(nan).sin));
  CHECK(std::isnan(sb::sincos(nan).cos));
  CHECK(std::isnan(sb::sincos_turns(nan).sin));
  CHECK(std::isnan(sb::atan2(nan, one)));
  CHECK(std::isnan(sb::atan2(one, nan)));
  CHECK(std::isnan(sb::exp(nan)));
  CHECK(std::isnan(sb::log(nan)));
  CHECK(std::isnan(sb::wrap_angle(nan)));
}
