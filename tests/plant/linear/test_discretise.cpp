#include <catch2/catch.hpp>
#include <cmath>

#include "plant/linear/discretise.hpp"
#include "plant/linear/exponential.hpp"
#include "tests/plant/linear/matrices.hpp"

using namespace slipbench::linear;
using Catch::Matchers::Contains;

TEST_CASE("matrix exponential: closed forms", "[linear]") {
  const double w = 2.0;
  const Matrix turn = exponential(rows({{0, w}, {-w, 0}}));
  // Products of a few well-conditioned factors: some eps.
  CHECK((turn - rows({{std::cos(w), std::sin(w)}, {-std::sin(w), std::cos(w)}})).norm() < 4e-15);
  CHECK((exponential(rows({{0, 1, 2}, {0, 0, 3}, {0, 0, 0}})) - rows({{1, 1, 3.5}, {0, 1, 3}, {0, 0, 1}})).norm() <
        1e-15);
  CHECK(exponential(rows({{-30}}))(0, 0) == Approx(std::exp(-30.0)).epsilon(1e-13));
  CHECK(exponential(Matrix::Zero(3, 3)) == Matrix::Identity(3, 3));
  CHECK(exponential(Matrix(0, 0)).size() == 0);
  // Entries far apart in size, which the scaling would drown: [0 a; b 0] with a b = -w^2.
  const Matrix wild = exponential(rows({{0, 1e9}, {-4e-9, 0}}));
  CHECK(wild(0, 0) == Approx(std::cos(w)).epsilon(1e-14));
  CHECK(wild(0, 1) == Approx(1e9 / w * std::sin(w)).epsilon(1e-14));
}

// C. Moler, C. Van Loan, "Nineteen dubious ways to compute the exponential of a matrix", SIAM Rev. 20, 1978, sec. 3:
// A = [-49 24; -64 31], e^A = [-0.735759 0.551819; -1.471518 1.103638] (six digits printed); poles -1, -17, closed form.
TEST_CASE("matrix exponential: Moler and Van Loan's example", "[linear][published]") {
  const Matrix a = rows({{-49, 24}, {-64, 31}}), e = exponential(a);
  CHECK((e - rows({{-0.735759, 0.551819}, {-1.471518, 1.103638}})).cwiseAbs().maxCoeff() < 6e-7);
  const double p = std::exp(-1.0), q = std::exp(-17.0);
  const Matrix exact = (p * (a + 17 * Matrix::Identity(2, 2)) - q * (a + Matrix::Identity(2, 2))) / 16;
  // Norm 86 against poles of 1: condition of e^A is about that.
  CHECK((e - exact).norm() < 1e-13);
}

TEST_CASE("matrix exponential: one that does not fit a double is refused", "[linear]") {
  CHECK_THAT(refusal([] { exponential(rows({{1000}})); }), Contains("does not fit") && Contains("1000"));
}

// M1: P.C. Krause, O. Wasynczuk, S.D. Sudhoff, "Analysis of Electric Machinery and Drive Systems", 2002, table 4.10-1.
// e^(A T) of the states (psi_s, psi_r), stationary frame, w_r = 0.95 * 2 pi 60, computed with 40 digits and printed to 15.
TEST_CASE("exact discretisation: the machine at constant speed", "[linear][published]") {
  const double pi = 3.141592653589793, w = 2 * pi * 60, r_s = 0.435, r_r = 0.816, l_m = 26.13 / w,
               l = (26.13 + 0.754) / w;
  const double det = l * l - l_m * l_m, w_r = 0.95 * w;
  // psi_s' = -R_s i_s, psi_r' = -R_r i_r + j w_r psi_r, i = L^-1 psi.
  Matrix a = Matrix::Zero(4, 4);
  for (int axis = 0; axis < 2; ++axis) {
    a(axis, axis) = -r_s * l / det;
    a(axis, 2 + axis) = r_s * l_m / det;
    a(2 + axis, axis) = r_r * l_m / det;
    a(2 + axis, 2 + axis) = -r_r * l / det;
  }
  a(2, 3) = -w_r;
  a(3, 2) = w_r;
  const auto check = [&](double T, Complex ss, Complex sr, Complex rs, Complex rr) {
    const Matrix e = discretise(free_system(a), T, Discretisation::zero_order_hold).A;
    const Complex printed[2][2] = {{ss, sr}, {rs, rr}};
    for (int i = 0; i < 2; ++i)
      for (int j = 0; j < 2; ++j) {
        // As printed: to 1e-15 or, where fewer digits are given, 1e-12.
        CHECK(std::abs(e(2 * i, 2 * j) - printed[i][j].real()) < 2e-14);
        CHECK(std::abs(e(2 * i + 1, 2 * j) - printed[i][j].imag()) < 1e-12);
        CHECK(std::abs(e(2 * i, 2 * j + 1) + printed[i][j].imag()) < 1e-12);
      }
  };
  check(1e-4, {.989137442290329, 1.266470176e-6}, {.010549571728831, 1.886279450798e-4},
        {.019789541449944, 3.538400073221e-4}, {.979000669078992, .0350758141826298});
  check(1e-3, {.904839827889073, .001093753879105}, {.089940191405808, .01601223678322},
        {.168715393533654, .030036747620936}, {.770297043823586, .287141162087077});
}

TEST_CASE("discretisation: first-order lag, all three in closed form", "[linear]") {
  // x' = -2 x + 3 u, y = 4 x, T = 0.1.
  const System s = system_of(rows({{-2}}), rows({{3}}), rows({{4}}));
  const System hold = discretise(s, 0.1, Discretisation::zero_order_hold);
  CHECK(hold.A(0, 0) == Approx(std::exp(-0.2)).epsilon(1e-15));
  CHECK(hold.B(0, 0) == Approx(1.5 * (1 - std::exp(-0.2))).epsilon(1e-14));
  CHECK(hold.sample_period_s == 0.1);
  CHECK(discretise(s, 0.1, Discretisation::euler).A(0, 0) == Approx(0.8).epsilon(1e-15));
  const System t = discretise(s, 0.1, Discretisation::tustin);
  CHECK(t.A(0, 0) == Approx(0.9 / 1.1).epsilon(1e-15));
  CHECK(t.B(0, 0) == Approx(0.3 / 1.1).epsilon(1e-15));
  CHECK(t.C(0, 0) == Approx(4 / 1.1).epsilon(1e-15));
  CHECK(t.D(0, 0) == Approx(4 / 1.1 * 0.15).epsilon(1e-15));
}

TEST_CASE("discretisation: the error falls with the period in the method's order", "[linear]") {
  const System s = system_of(rows({{0, 1}, {-100, -4}}), rows({{0}, {100}}), rows({{1, 0}}));
  // Poles: Euler's error is (pT)^2 / 2, Tustin's (pT)^3 / 12: a half of the period gives a quarter, an eighth. 5 %: next term.
  const auto ratio = [&](Discretisation d) {
    return discretisation_error(s, 2e-3, d).pole / discretisation_error(s, 1e-3, d).pole;
  };
  CHECK(ratio(Discretisation::euler) == Approx(4.0).epsilon(0.05));
  CHECK(ratio(Discretisation::tustin) == Approx(8.0).epsilon(0.05));
  CHECK(discretisation_error(s, 1e-3, Discretisation::zero_order_hold).pole < 1e-13);
  // A hold delays by half a period: at a tenth of Nyquist's frequency 0.05 pi rad, so 2 sin(0.025 pi) or a little more.
  const auto hold = discretisation_error(s, 1e-3, Discretisation::zero_order_hold);
  CHECK(hold.response_to_tenth == Approx(0.157).epsilon(0.02));
  CHECK(hold.response_to_half > hold.response_to_tenth);
}

TEST_CASE("discretisation: Euler's loss of stability is said; misuse is refused", "[linear]") {
  const System s = system_of(rows({{0, 1}, {-100, -0.1}}), rows({{0}, {100}}), rows({{1, 0}}));
  CHECK_THAT(discretisation_error(s, 0.01, Discretisation::euler).warning, Contains("outside the unit circle"));
  CHECK(discretisation_error(s, 0.01, Discretisation::tustin).warning.empty());
  CHECK_THAT(refusal([&] { discretise(s, 0.0, Discretisation::euler); }), Contains("period"));
  CHECK_THAT(refusal([&] { discretise(discretise(s, 0.1, Discretisation::euler), 0.1, Discretisation::euler); }),
             Contains("discrete already"));
  CHECK_THAT(refusal([] { discretise(free_system(rows({{20}})), 0.1, Discretisation::tustin); }), Contains("pole 20"));
}
