// Riccati equations against the benchmark collections CAREX and DAREX: P. Benner, A.J. Laub, V. Mehrmann, "A collection of
// benchmark examples for the numerical solution of algebraic Riccati equations", I (continuous) and II (discrete), TU Chemnitz
// SPC 95_22 and 95_23, 1995. Solutions in closed form there, or computed with 60 digits from the matrices.
#include <catch2/catch.hpp>

#include "plant/linear/pole_set.hpp"
#include "plant/linear/riccati.hpp"
#include "tests/plant/linear/design_matrices.hpp"

using namespace slipbench::linear;
using Catch::Matchers::Contains;

namespace {

constexpr double unit = 0x1p-52;

struct Example {
  const char* name;
  Matrix A, B, Q, R, N, X;
  std::vector<Complex> poles;
  bool discrete;
};

// The data are rounded to 2^-52 and the solver is allowed ten times that at the condition it states itself; a table of 14 to 17 digits
// adds a few units more.
void check(const Example& e) {
  INFO(e.name);
  const auto r = e.discrete ? dare(e.A, e.B, e.Q, e.R, e.N) : care(e.A, e.B, e.Q, e.R, e.N);
  CAPTURE(r.condition, r.residual, relative(r.X, e.X), r.warning, text_of(r.closed_loop_poles));
  CHECK(relative(r.X, e.X) <= 10.0 * unit * r.condition);
  CHECK(r.residual < 1e-13);
  CHECK(r.condition < 1e6);
  CHECK(r.warning.empty());
  // Double poles split by the root of the rounding: 1e-7.
  CHECK(pole_distance(e.poles, r.closed_loop_poles) < 1e-7);
  CHECK((r.X - r.X.transpose()).norm() == 0.0);
}

const Matrix laub_A = rows({{4, 3}, {-4.5, -3.5}}), laub_B = rows({{1}, {-1}}), laub_Q = rows({{9, 6}, {6, 4}});

Matrix petkov_V() { return Matrix::Identity(3, 3) - 2.0 / 3.0 * Matrix::Ones(3, 3); }

// CAREX 2.6: A = V eps diag(1, 2, 3) V, Q = V diag(1/eps, 1, eps) V, R = eps I.
Example petkov(double eps) {
  const Matrix V = petkov_V();
  const auto in_V = [&](double a, double b, double c) { return Matrix(V * diagonal({a, b, c}) * V); };
  const double e2 = eps * eps, e4 = e2 * e2;
  return {"CAREX 2.6",
          in_V(eps, 2 * eps, 3 * eps),
          Matrix::Identity(3, 3),
          in_V(1 / eps, 1, eps),
          eps * Matrix::Identity(3, 3),
          {},
          in_V(e2 + std::sqrt(e4 + 1), 2 * e2 + std::sqrt(4 * e4 + eps), 3 * e2 + std::sqrt(9 * e4 + e2)),
          {-std::sqrt(e4 + 1) / eps, -std::sqrt(4 * e4 + eps) / eps, -std::sqrt(9 * e4 + e2) / eps},
          false};
}

Example arnold(double eps) {
  const double root = std::sqrt(1 + eps * eps), x12 = 1 / (2 + root);
  return {"CAREX 2.1",
          diagonal({1, -2}),
          rows({{eps}, {0}}),
          Matrix::Ones(2, 2),
          rows({{1}}),
          {},
          rows({{(1 + root) / (eps * eps), x12}, {x12, (1 - eps * eps * x12 * x12) / 4}}),
          {-2, -root},
          false};
}

}  // namespace

TEST_CASE("continuous Riccati: CAREX to rounding times the stated condition", "[plant][linear][published]") {
  check({"1.1",
         rows({{0, 1}, {0, 0}}),
         rows({{0}, {1}}),
         diagonal({1, 2}),
         rows({{1}}),
         {},
         rows({{2, 1}, {1, 2}}),
         {-1, -1},
         false});
  check({"1.2",
         laub_A,
         laub_B,
         laub_Q,
         rows({{1}}),
         {},
         (1 + std::sqrt(2.0)) * laub_Q,
         {-1.414213562373095, -0.5},
         false});
  check(arnold(1.0));
  check(arnold(1e-6));
  const double root = std::sqrt(201.0);
  check({"2.3, eps = 100",
         rows({{0, 100}, {0, 0}}),
         rows({{0}, {1}}),
         Matrix::Identity(2, 2),
         rows({{1}}),
         {},
         rows({{root / 100, 1}, {1, root}}),
         {{-7.08872343937891, 7.05336798983294}, {-7.08872343937891, -7.05336798983294}},
         false});
  check({"2.4, eps = 1",
         rows({{2, 1}, {1, 2}}),
         Matrix::Identity(2, 2),
         Matrix::Identity(2, 2),
         Matrix::Identity(2, 2),
         {},
         rows({{4.2882456112707372, 1.8740320488976421}, {1.8740320488976421, 4.2882456112707372}}),
         {-std::sqrt(10.0), -std::sqrt(2.0)},
         false});
  check({"2.5, eps = 1, Q indefinite",
         rows({{2, 1}, {4, 1}}),
         rows({{1}, {1}}),
         rows({{-7, -3}, {-3, 0}}),
         rows({{1}}),
         {},
         rows({{2, 1}, {1, 1}}),
         {{-1, 1}, {-1, -1}},
         false});
  check(petkov(1.0));
}

TEST_CASE("continuous Riccati: CAREX 2.6 at 1e6 is right to its stated error, or warns", "[plant][linear][published]") {
  const auto e = petkov(1e6);
  const auto r = care(e.A, e.B, e.Q, e.R);
  CAPTURE(r.condition, r.residual, r.warning, relative(r.X, e.X));
  // Solvers that don't scale by the solution found lose 13 digits here.
  CHECK((relative(r.X, e.X) <= 10.0 * unit * r.condition || !r.warning.empty()));
  CHECK(pole_distance(e.poles, r.closed_loop_poles) < 1e-10);
}

TEST_CASE("continuous Riccati: where rounding of the data decides the digits, a warning stands", "[plant][linear]") {
  // Beside a mode at -1 one at 1e-12 with weight 1e-12, reached by 1e-6 of the input, in mixed coordinates: its closed-loop pole, of the order
  // of 1e-12, and so its share of X hang on digits that the data do not hold.
  const Matrix T = rows({{1, 1}, {1, -1}}) / std::sqrt(2.0);
  const Matrix A = T * diagonal({-1, 1e-12}) * T, B = T * rows({{1}, {1e-6}}), Q = T * diagonal({1, 1e-12}) * T;
  const auto r = care(A, B, Q, rows({{1}}));
  CAPTURE(r.condition, r.residual);
  CHECK_THAT(r.warning, Contains("ill-conditioned") && Contains("residual"));
}

TEST_CASE("discrete Riccati: DAREX to rounding times the stated condition", "[plant][linear][published]") {
  check({"1.1, R = 0",
         rows({{2, -1}, {1, 0}}),
         rows({{1}, {0}}),
         diagonal({0, 1}),
         rows({{0}}),
         {},
         Matrix::Identity(2, 2),
         {0, 0},
         true});
  CHECK(relative(dare(rows({{2, -1}, {1, 0}}), rows({{1}, {0}}), diagonal({0, 1}), rows({{0}})).K, rows({{2, -1}})) <
        1e-14);
  check({"1.2, R singular, cross term",
         rows({{0, 1}, {0, -1}}),
         rows({{1, 0}, {2, 1}}),
         rows({{-4.0 / 11, -4.0 / 11}, {-4.0 / 11, 7.0 / 11}}),
         rows({{9, 3}, {3, 1}}),
         rows({{3, 1}, {-1, 7}}),
         rows({{-1.4021341244239196, 13.056866399158116}, {13.056866399158116, -125.63649279529077}}),
         {-.217058149756746, .68727169166381},
         true});
  check({"1.3",
         rows({{0, 1}, {0, 0}}),
         rows({{0}, {1}}),
         rows({{1, 2}, {2, 4}}),
         rows({{1}}),
         {},
         rows({{1, 2}, {2, 2 + std::sqrt(5.0)}}),
         {-.381966011250105, 0},
         true});
  // The solution some collections store has 0 in the corner; its residual is -9.9 (Newton's method with 60 digits agrees with -9.9).
  check({"1.4, R singular, Q indefinite",
         rows({{0, .1, 0}, {0, 0, .01}, {0, 0, 0}}),
         rows({{1, 0}, {0, 0}, {0, 1}}),
         diagonal({1e5, 1e3, -10}),
         diagonal({0, 1}),
         {},
         diagonal({1e5, 1e3, -9.9}),
         {0, 0, 0},
         true});
  check({"2.1, r = 1",
         laub_A,
         laub_B,
         laub_Q,
         rows({{1}}),
         {},
         (1 + std::sqrt(5.0)) / 2 * laub_Q,
         {-.5, .381966011250105},
         true});
  check({"2.1, r = 100",
         laub_A,
         laub_B,
         laub_Q,
         rows({{100}}),
         {},
         (1 + std::sqrt(401.0)) / 2 * laub_Q,
         {-.5, .904875078027496},
         true});
  check({"2.2",
         diagonal({.9512, .9048}),
         rows({{4.877, 4.877}, {-1.1895, 3.569}}),
         diagonal({.005, .02}),
         diagonal({1.0 / 3, 3}),
         {},
         rows({{.010459082320970094, .0032246444774195445}, {.0032246444774195445, .050397741135642811}}),
         {.508333461684188, .688069670988909},
         true});
  for (const double eps : {1.0, 100.0})
    check({"2.3",
           rows({{0, eps}, {0, 0}}),
           rows({{0}, {1}}),
           Matrix::Identity(2, 2),
           rows({{1}}),
           {},
           diagonal({1, 1 + eps * eps}),
           {0, 0},
           true});
}

TEST_CASE("Riccati: a cross term is a shift of the input", "[plant][linear]") {
  // u = v - R^-1 N'x takes the cross term away: A - B R^-1 N', Q - N R^-1 N' have the same X.
  const Matrix A = rows({{0.5, 1, 0}, {-2, -.3, .4}, {.1, 0, .8}}), B = rows({{0, 1}, {1, 0}, {.5, .2}}),
               Q = diagonal({3, 1, 2}), R = diagonal({1, 2}), N = rows({{.1, .2}, {0, -.3}, {.2, .1}});
  const Matrix shift = diagonal({1, .5}) * N.transpose(), As = A - B * shift, Qs = Q - N * shift;
  // Both are well conditioned (below 100 each): rounding times that.
  CHECK(relative(care(A, B, Q, R, N).X, care(As, B, Qs, R).X) < 1e-13);
  CHECK(relative(dare(A, B, Q, R, N).X, dare(As, B, Qs, R).X) < 1e-13);
}

TEST_CASE("Riccati: what has no solution is refused with the eigenvalue", "[plant][linear]") {
  const Matrix one = rows({{1}}), zero = rows({{0}});
  // An oscillator of 3 rad/s that no input reaches, an integrator that no weight sees.
  CHECK_THAT(refusal([&] {
               care(rows({{0, 3}, {-3, 0}}), Matrix::Zero(2, 1), Matrix::Identity(2, 2), one);
             }),
             Contains("3j") && Contains("imaginary axis"));
  CHECK_THAT(refusal([&] { care(zero, one, zero, one); }), Contains("imaginary axis"));
  CHECK_THAT(refusal([&] { dare(one, one, zero, one); }), Contains("at 1, on the unit circle"));
  CHECK_THAT(refusal([&] { care(zero, one, one, zero); }), Contains("R is singular"));
  // Two inputs that do the same, neither weighed.
  CHECK_THAT(refusal([&] {
               dare(one, rows({{1, 1}}), one, Matrix::Zero(2, 2));
             }),
             Contains("neither weight nor effect"));
  CHECK_THAT(refusal([&] { care(zero, one, rows({{1, 2}, {0, 1}}), one); }), Contains("Q is 2 x 2, but must be 1 x 1"));
  CHECK_THAT(refusal([&] {
               care(diagonal({1, 1}), Matrix::Identity(2, 2), rows({{1, 2}, {0, 1}}), diagonal({1, 1}));
             }),
             Contains("Q must be symmetric"));
}

TEST_CASE("Riccati: no states, no inputs", "[plant][linear]") {
  CHECK(care(Matrix(0, 0), Matrix(0, 1), Matrix(0, 0), rows({{1}})).K.rows() == 1);
  // x' = -x without input: 2 X = Q. x+ = x/2: X - X/4 = Q.
  CHECK(care(rows({{-1}}), Matrix(1, 0), rows({{3}}), Matrix(0, 0)).X(0, 0) == Approx(1.5).epsilon(1e-15));
  CHECK(dare(rows({{.5}}), Matrix(1, 0), rows({{3}}), Matrix(0, 0)).X(0, 0) == Approx(4.0).epsilon(1e-15));
}
