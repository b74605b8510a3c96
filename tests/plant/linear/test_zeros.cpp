#include <catch2/catch.hpp>

#include "plant/linear/zeros.hpp"
#include "tests/plant/linear/matrices.hpp"

using namespace slipbench::linear;
using Catch::Matchers::Contains;

namespace {

// (s - 3)(s + 4) / ((s + 1)(s + 2)(s + 5)) in controllable canonical form.
System two_zeros() {
  return system_of(rows({{0, 1, 0}, {0, 0, 1}, {-10, -17, -8}}), rows({{0}, {0}, {1}}), rows({{-12, 1, 1}}));
}

}  // namespace

TEST_CASE("zeros: roots of the numerator", "[linear]") {
  const auto z = transmission_zeros(two_zeros());
  REQUIRE(z.size() == 2);
  // Separated roots of a small polynomial: a few dozen roundings.
  CHECK(z[0].real() == Approx(3.0).epsilon(1e-13));
  CHECK(z[1].real() == Approx(-4.0).epsilon(1e-13));
  CHECK(z[0].imag() == 0.0);
}

TEST_CASE("zeros: with direct feed-through as many as states; a pair is a pair", "[linear]") {
  // 1 + 1 / (s^2 + 2 s + 4) = (s^2 + 2 s + 5) / (...): -1 +- 2j.
  System s = system_of(rows({{0, 1}, {-4, -2}}), rows({{0}, {1}}), rows({{1, 0}}));
  s.D = rows({{1}});
  const auto z = invariant_zeros(s);
  REQUIRE(z.size() == 2);
  CHECK(z[0].real() == Approx(-1.0).epsilon(1e-13));
  CHECK(z[0].imag() == Approx(2.0).epsilon(1e-13));
  CHECK(z[1].imag() == Approx(-2.0).epsilon(1e-13));
}

TEST_CASE("zeros: a mode that cancels is an invariant zero, no transmission zero", "[linear]") {
  // 1 / (s + 1) with -2 unobservable.
  const System s = system_of(rows({{-1, 0}, {0, -2}}), rows({{1}, {1}}), rows({{1, 0}}));
  REQUIRE(invariant_zeros(s).size() == 1);
  CHECK(invariant_zeros(s)[0].real() == Approx(-2.0).epsilon(1e-13));
  CHECK(transmission_zeros(s).empty());
}

// J.M. Maciejowski, "Multivariable Feedback Design", 1989, example 2.2 (from memory): the 3 x 2 matrix with elements
// 1/(s+1)(s+2) * [1 -1; s^2+s-4 2s^2-s-8; s^2-4 2s^2-8] has one zero, at 2. Here its state space by hand over each column.
TEST_CASE("zeros: more outputs than inputs", "[linear][published]") {
  // Each column over (s+1)(s+2) = s^2 + 3 s + 2: numerators less D times the denominator.
  const Matrix d = rows({{0, 0}, {1, 2}, {1, 2}});
  System s =
      system_of(rows({{0, 1, 0, 0}, {-2, -3, 0, 0}, {0, 0, 0, 1}, {0, 0, -2, -3}}),
                rows({{0, 0}, {1, 0}, {0, 0}, {0, 1}}), rows({{1, 0, -1, 0}, {-6, -2, -12, -7}, {-6, -3, -12, -6}}));
  s.D = d;
  const auto z = transmission_zeros(s);
  REQUIRE(z.size() == 1);
  // The example's minimal order is 3 (a pole at -1 and two at -2): one mode is taken off first.
  CHECK(z[0].real() == Approx(2.0).epsilon(1e-11));
}

TEST_CASE("zeros: none without states, inputs, outputs or finite ones", "[linear]") {
  CHECK(invariant_zeros(free_system(rows({{-1}}))).empty());
  CHECK(invariant_zeros(free_system(Matrix(0, 0))).empty());
  CHECK(invariant_zeros(system_of(rows({{0, 1}, {0, 0}}), rows({{0}, {1}}), rows({{1, 0}}))).empty());
}

TEST_CASE("DC gain: closed form, continuous and discrete", "[linear]") {
  CHECK(dc_gain(two_zeros())(0, 0) == Approx(-1.2).epsilon(1e-14));
  CHECK(dc_gain(system_of(rows({{0.5}}), rows({{3}}), rows({{2}}), 0.1))(0, 0) == Approx(12.0).epsilon(1e-15));
}

TEST_CASE("DC gain: an integrator is named; one that is not seen does not disturb", "[linear]") {
  System s = system_of(rows({{-1, 0}, {1, 0}}), rows({{1}, {0}}), rows({{0, 1}}));
  s.state_names = {"speed", "angle"};
  CHECK_THAT(refusal([&] { dc_gain(s); }), Contains("pole 0") && Contains("angle"));
  s.C = rows({{1, 0}});
  CHECK(dc_gain(s)(0, 0) == Approx(1.0).epsilon(1e-14));
  CHECK_THAT(refusal([] { dc_gain(system_of(rows({{1}}), rows({{1}}), rows({{1}}), 0.1)); }), Contains("pole 1"));
}
