#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "plant/linear/poles.hpp"
#include "tests/plant/linear/matrices.hpp"

using namespace slipbench::linear;
using Catch::Matchers::Contains;

TEST_CASE("modes: damping, frequency and time constant of s^2 + 2 d w s + w^2", "[linear]") {
  const double d = 0.3, w = 50.0;
  const auto modes = modes_of(free_system(rows({{0, 1}, {-w * w, -2 * d * w}})));
  REQUIRE(modes.size() == 2);
  for (const Mode& mode : modes) {
    // A few roundings of a well-conditioned pair.
    CHECK(mode.damping == Approx(d).epsilon(1e-14));
    CHECK(mode.frequency_rad_s == Approx(w).epsilon(1e-14));
    CHECK(mode.time_constant_s == Approx(1.0 / (d * w)).epsilon(1e-14));
  }
  CHECK(modes[0].pole.imag() > 0.0);
  CHECK(modes[1].pole == std::conj(modes[0].pole));
}

TEST_CASE("modes: a discrete pole means its continuous one", "[linear]") {
  const double T = 0.01;
  const Mode mode = mode_of(Complex(std::exp(-5 * T) * std::cos(20 * T), std::exp(-5 * T) * std::sin(20 * T)), T);
  // Logarithm near 1: its rounding is divided by T.
  CHECK(mode.time_constant_s == Approx(0.2).epsilon(1e-12));
  CHECK(mode.frequency_rad_s == Approx(std::sqrt(425.0)).epsilon(1e-12));
  const Mode dead_beat = mode_of(0.0, T);
  CHECK(dead_beat.damping == 1.0);
  CHECK(dead_beat.time_constant_s == 0.0);
  CHECK(mode_of(0.0, 0.0).time_constant_s == std::numeric_limits<double>::infinity());
}

TEST_CASE("modes: order by real part, by magnitude when discrete", "[linear]") {
  const Matrix a = rows({{-0.9, 0, 0}, {0, 0.5, 0}, {0, 0, 0.1}});
  CHECK(modes_of(free_system(a))[0].pole == Complex(0.5));
  CHECK(modes_of(free_system(a, 1.0))[0].pole == Complex(-0.9));
}

TEST_CASE("stability: the deciding mode is named", "[linear]") {
  const auto of = [](const Matrix& a, double period = 0.0) { return stability_of(free_system(a, period)); };
  SECTION("stable") {
    const Verdict v = of(rows({{-1, 0}, {0, -20}}));
    CHECK(v.stability == Stability::stable);
    CHECK_THAT(v.why, Contains("pole -1 ") && Contains("time constant 1 s"));
  }
  SECTION("unstable") {
    const Verdict v = of(rows({{2, 0}, {0, -20}}));
    CHECK(v.stability == Stability::unstable);
    CHECK_THAT(v.why, Contains("pole 2 ") && Contains("0.5 s"));
  }
  SECTION("one integrator, and two that do not feed each other") {
    CHECK(of(rows({{0, 0}, {0, -1}})).stability == Stability::marginal);
    CHECK(of(rows({{0, 0}, {0, 0}})).stability == Stability::marginal);
  }
  SECTION("oscillator; twice, apart and chained") {
    const Matrix w = rows({{0, 3}, {-3, 0}});
    CHECK(of(w).stability == Stability::marginal);
    Matrix two = Matrix::Zero(4, 4);
    two.topLeftCorner(2, 2) = two.bottomRightCorner(2, 2) = w;
    CHECK(of(two).stability == Stability::marginal);
    two(0, 2) = two(1, 3) = 1.0;
    CHECK(of(two).stability == Stability::unstable);
  }
  SECTION("double integrator, plain and in other coordinates") {
    const Matrix a = rows({{0, 1}, {0, 0}});
    const Verdict v = of(a);
    CHECK(v.stability == Stability::unstable);
    CHECK_THAT(v.why, Contains("pole 0 ") && Contains("2 times") && Contains("1 eigenvector") && Contains("Jordan"));
    const Matrix t = rows({{2, 1}, {3, 2}}), back = rows({{2, -1}, {-3, 2}});
    CHECK(of(t * a * back).stability == Stability::unstable);
    const Verdict scaled = of(1e6 * a);
    CHECK_THAT(scaled.why, Contains("Jordan"));
  }
  SECTION("discrete: 1 once is marginal, chained unstable, inside stable") {
    CHECK(of(rows({{1, 0}, {0, 0.5}}), 0.1).stability == Stability::marginal);
    CHECK(of(rows({{1, 1}, {0, 1}}), 0.1).stability == Stability::unstable);
    CHECK(of(rows({{0.9, 1}, {0, 0.9}}), 0.1).stability == Stability::stable);
    CHECK_THAT(of(rows({{-1.1, 0}, {0, 0.5}}), 0.1).why, Contains("pole -1.1 outside the unit circle"));
  }
  SECTION("a slow pole beside a fast one is no integrator") {
    CHECK(of(rows({{-1e9, 0}, {0, -1e-3}})).stability == Stability::stable);
    CHECK(of(rows({{-1e9, 0}, {0, 1e-3}})).stability == Stability::unstable);
  }
  SECTION("no states") { CHECK(of(Matrix(0, 0)).stability == Stability::stable); }
}

TEST_CASE("pole groups: a Jordan block is one pole with one eigenvector, near poles are two", "[linear]") {
  const auto defective = pole_groups(rows({{-2, 1, 0}, {0, -2, 1}, {0, 0, -2}}));
  REQUIRE(defective.size() == 1);
  CHECK(defective[0].count == 3);
  CHECK(defective[0].eigenvectors == 1);
  const auto equal = pole_groups(rows({{-2, 0}, {0, -2}}));
  REQUIRE(equal.size() == 1);
  CHECK(equal[0].eigenvectors == 2);
  CHECK(pole_groups(rows({{-2, 0}, {0, -2.000001}})).size() == 2);
}
