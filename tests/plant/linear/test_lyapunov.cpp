#include <catch2/catch.hpp>

#include "plant/linear/gramians.hpp"
#include "plant/linear/lyapunov.hpp"
#include "tests/plant/linear/matrices.hpp"

using namespace slipbench::linear;
using Catch::Matchers::Contains;

namespace {
const Matrix slicot_a = rows({{3, 1, 1}, {1, 3, 0}, {0, 0, 3}});
const Matrix slicot_c = rows({{25, 24, 15}, {24, 32, 8}, {15, 8, 40}});
}  // namespace

// SLICOT Library, example of SB03MD: A'X A - X = C; X exact, residual 0.
TEST_CASE("Stein's equation: the example of SB03MD", "[linear][published]") {
  const Matrix x = stein(slicot_a.transpose(), -slicot_c), exact = rows({{2, 1, 1}, {1, 3, 0}, {1, 0, 4}});
  // Condition of the equation is about 20: 100 eps.
  CHECK((x - exact).norm() <= 2e-14 * exact.norm());
  CHECK(stein_residual(slicot_a.transpose(), x, -slicot_c) < 1e-15);
}

// SLICOT Library, example of SB03TD: A'X + X A = C with the same A and C.
TEST_CASE("Lyapunov's equation: the example of SB03TD", "[linear][published]") {
  const Matrix x = lyapunov(slicot_a.transpose(), -slicot_c);
  const Matrix printed = rows({{3.2604166666666667, 2.71875, 1.861607142857},
                               {2.71875, 4.427083333333, 0.56994047619},
                               {1.861607142857, 0.56994047619, 6.046130952381}});
  // Twelve digits are printed.
  CHECK((x - printed).cwiseAbs().maxCoeff() < 1e-12);
  CHECK(lyapunov_residual(slicot_a.transpose(), x, -slicot_c) < 1e-15);
}

// SLICOT Library, example of SB03OD: A'X + X A = -B'B, X = U'U exact.
TEST_CASE("Lyapunov's equation: the example of SB03OD", "[linear][published]") {
  const Matrix a = rows({{-1, 37, -12, -12}, {-1, -10, 0, 4}, {2, -4, 7, -6}, {2, 2, 7, -9}});
  const Matrix b = rows({{1, 2.5, 1, 3.5}, {0, 1, 0, 1}, {-1, -2.5, -1, -1.5}, {1, 2.5, 4, -5.5}, {-1, -2.5, -4, 3.5}});
  const Matrix exact = rows({{1, 3, 2, -1}, {3, 10, 5, -2}, {2, 5, 6, -5}, {-1, -2, -5, 7}});
  const Matrix x = lyapunov(a.transpose(), b.transpose() * b);
  // ||A|| is 40 and the slowest pole about 1: condition some 100, times n eps.
  CHECK((x - exact).norm() <= 1e-12 * exact.norm());
}

TEST_CASE("Sylvester: a right side that is no square, residual by hand", "[linear]") {
  const Matrix a = rows({{0, 1, 0}, {-2, -3, 1}, {0, 4, -5}}), b = rows({{1, 7}, {-7, 1}});
  const Matrix q = rows({{1, 2}, {3, 4}, {5, 6}});
  const Matrix x = sylvester(a, b, q);
  CHECK((a * x + x * b + q).norm() <= 1e-14 * (a.norm() + b.norm()) * x.norm());
}

TEST_CASE("Lyapunov and Stein: one state in closed form, and a right side that is not symmetric", "[linear]") {
  CHECK(lyapunov(rows({{-2}}), rows({{12}}))(0, 0) == 3.0);
  CHECK(stein(rows({{0.5}}), rows({{3}}))(0, 0) == 4.0);
  const Matrix a = rows({{-1, 2}, {0, -3}}), q = rows({{1, 5}, {0, 2}});
  CHECK(lyapunov_residual(a, lyapunov(a, q), q) < 1e-15);
  const Matrix d = rows({{0.5, 2}, {-0.1, 0.3}});
  CHECK(stein_residual(d, stein(d, q), q) < 1e-15);
}

TEST_CASE("Lyapunov and Stein: no single solution is refused, the poles named", "[linear]") {
  CHECK_THAT(refusal([] { lyapunov(rows({{1, 0}, {0, -1}}), rows({{1, 0}, {0, 1}})); }), Contains("1 and -1"));
  CHECK_THAT(refusal([] { lyapunov(rows({{0}}), rows({{1}})); }), Contains("sum to zero"));
  CHECK_THAT(refusal([] { stein(rows({{2, 0}, {0, 0.5}}), rows({{1, 0}, {0, 1}})); }), Contains("product"));
  CHECK_THAT(refusal([] { lyapunov(rows({{0, 2}, {-2, 0}}), rows({{1, 0}, {0, 1}})); }), Contains("2j"));
}

TEST_CASE("Gramians: first-order lag in closed form, in wild units too", "[linear]") {
  // x' = -a x + b u, y = c x: Wc = b^2 / 2a, Wo = c^2 / 2a. Squares and quotients round a few times.
  const Gramians w = gramians(system_of(rows({{-4}}), rows({{1e9}}), rows({{1e-9}})));
  CHECK(w.controllability(0, 0) == Approx(1e18 / 8).epsilon(1e-15));
  CHECK(w.observability(0, 0) == Approx(1e-18 / 8).epsilon(1e-15));
  // Discrete: b^2 / (1 - a^2).
  CHECK(gramians(system_of(rows({{0.5}}), rows({{3}}), rows({{1}}), 1.0)).controllability(0, 0) ==
        Approx(12).epsilon(1e-15));
}

TEST_CASE("Gramians: refused for a system that is not stable, mode named", "[linear]") {
  CHECK_THAT(refusal([] { gramians(system_of(rows({{0}}), rows({{1}}), rows({{1}}))); }), Contains("pole 0"));
  CHECK_THAT(refusal([] { gramians(system_of(rows({{3}}), rows({{1}}), rows({{1}}))); }), Contains("pole 3"));
  CHECK(gramians(free_system(Matrix(0, 0))).controllability.size() == 0);
}

TEST_CASE("Gramians: a pole a hair from the axis is warned of with its magnification", "[linear]") {
  const Gramians w = gramians(system_of(rows({{-1e-11, 1}, {0, -1}}), rows({{1}, {1}}), rows({{1, 1}})));
  CHECK_THAT(w.warning, Contains("ill-conditioned") && Contains("residual"));
}
