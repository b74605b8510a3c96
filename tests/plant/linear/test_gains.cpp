// State feedback, observers and stationary Kalman filters against printed examples, and what is refused.
#include <catch2/catch.hpp>

#include "plant/linear/combined.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/kalman.hpp"
#include "plant/linear/lyapunov.hpp"
#include "plant/linear/place.hpp"
#include "plant/linear/pole_set.hpp"
#include "tests/plant/linear/design_matrices.hpp"

using namespace slipbench::linear;
using Catch::Matchers::Contains;

namespace {

// Ogata's plant and the double integrator are exact in a few digits; the elimination of order 2 or 3 rounds a few times.
constexpr double few_roundings = 1e-13;

const Matrix column3 = rows({{0}, {0}, {1}});

// Munro's chemical reactor, BN1 of R. Byers, S.G. Nash, Int. J. Control 49 1989, 97-117 (B as printed there).
const Matrix bn1_A = rows({{1.38, -.2077, 6.715, -5.676},
                           {-.5814, -4.29, 0, .675},
                           {1.067, 4.273, -6.654, 5.893},
                           {.048, 4.273, 1.343, -2.104}});
const Matrix bn1_B = rows({{0, 0}, {5.679, 0}, {1.136, -3.146}, {1.136, 0}});

}  // namespace

TEST_CASE("pole placement, one input: K. Ogata, Modern Control Engineering, ch. 10", "[plant][linear][published]") {
  const Matrix A = rows({{0, 1, 0}, {0, 0, 1}, {-1, -5, -6}}), plant = rows({{0, 1, 0}, {0, 0, 1}, {-6, -11, -6}});
  const double root = 2 * std::sqrt(3.0);
  CHECK(relative(place(seen_whole(A, column3), {{-2, 4}, {-2, -4}, -10}).K, rows({{199, 55, 8}})) < few_roundings);
  CHECK(relative(place(seen_whole(plant, column3), {{-2, root}, -6, {-2, -root}}).K, rows({{90, 29, 4}})) <
        few_roundings);
  CHECK(relative(observer_by_poles(system_of(plant, column3, rows({{1, 0, 0}})), {{-2, root}, {-2, -root}, -5}).L,
                 rows({{3}, {7}, {-1}})) < few_roundings);
  CHECK(relative(observer_by_poles(system_of(rows({{0, 20.6}, {1, 0}}), rows({{0}, {1}}), rows({{0, 1}})),
                                   {{-1.8, 2.4}, {-1.8, -2.4}})
                     .L,
                 rows({{29.6}, {3.6}})) < few_roundings);
}

TEST_CASE("pole placement, discrete: double integrator of Franklin, Powell, Workman", "[plant][linear][published]") {
  const auto s = seen_whole(rows({{1, .1}, {0, 1}}), rows({{.005}, {.1}}), 0.1);
  CHECK(relative(place(s, {{.8, .25}, {.8, -.25}}).K, rows({{10.25, 3.4875}})) < few_roundings);
  const auto dead = place(s, {0, 0});
  CHECK(relative(dead.K, rows({{100, 15}})) < few_roundings);
  CHECK(dead.residual <
        1e-4);  // the double pole splits by the root of the rounding of 100, 1e-7, against 1e-3 of the pole at 1
  const Matrix closed = s.A - s.B * dead.K;
  CHECK((closed * closed).norm() < 1e-12);  // at rest in two steps; gains of 100 times rounding
}

TEST_CASE("pole placement, several inputs: conditioning of Byers and Nash's examples", "[plant][linear][published]") {
  struct Row {
    const char* name;
    Matrix A, B;
    std::vector<Complex> poles;
    double kappa, gain;  // best found for the table of published values; 0: not given there
  };
  const std::vector<Row> table = {
      {"BN1", bn1_A, bn1_B, {-.2, -.5, -5.0566, -8.6659}, 4.2722, 1.2822},
      {"BN1 with B as often reprinted",
       bn1_A,
       rows({{0, 5.679}, {1.136, 1.136}, {0, 0}, {-3.146, 0}}),
       {-.2, -.5, -5.0566, -8.6659},
       2.5275,
       0},
      {"BN4", rows({{0, 1, 0}, {0, 0, 1}, {-6, -11, -6}}), rows({{1, 1}, {0, 1}, {1, 1}}), {-1, -2, -3}, 10.7738, 0},
      {"BN11",
       rows({{0, 0, 0, 0}, {1, 10, 100, 1000}, {0, 1, 10, 100}, {0, 0, 1, 10}}),
       rows({{1, 0}, {0, 1}, {0, 0}, {0, 0}}),
       {-1, -2, -3, -4},
       12443.38,
       6580.68}};
  for (const auto& row : table) {
    INFO(row.name);
    const auto f = place(seen_whole(row.A, row.B), row.poles);
    CAPTURE(f.condition, f.residual, largest_singular_value(f.K));
    // The gain is not unique: another optimum may be the better one, none much worse. Volume and kappa_2 peak a little apart.
    CHECK(f.condition < 1.02 * row.kappa);
    CHECK(f.condition > 0.5 * row.kappa);
    if (row.gain > 0) CHECK(largest_singular_value(f.K) < 1.5 * row.gain);
    // Bauer and Fike: a pole moves by kappa_2(X) times the rounding of A - B K.
    CHECK(f.residual < 1e-14 * f.condition * (1.0 + (row.A.norm() + (row.B * f.K).norm())));
    CHECK(f.warning.empty());
  }
}

TEST_CASE("pole placement, several inputs: complex pairs and repeated poles", "[plant][linear]") {
  for (const std::vector<Complex>& poles : std::vector<std::vector<Complex>>{{{-1, 2}, {-1, -2}, {-3, 1}, {-3, -1}},
                                                                             {{-1, 2}, {-1, -2}, -3, -3},
                                                                             {-2, -2, -5, -5},
                                                                             {{-1, 2}, {-1, 2}, {-1, -2}, {-1, -2}}}) {
    INFO(text_of(poles));
    const auto f = place(seen_whole(bn1_A, bn1_B), poles);
    CAPTURE(f.condition, f.warning, text_of(f.poles));
    // Full sets of eigenvectors: no split by the root of the rounding.
    CHECK(f.condition < 1e3);
    CHECK(f.residual < 1e-11);
    CHECK(f.warning.empty());
  }
  // Three times with two inputs: no full set; the triple pole splits by the third root of the rounding (6e-6) times the moves.
  const auto f = place(seen_whole(bn1_A, bn1_B), {-2, -2, -2, -2});
  CHECK_THAT(f.warning, Contains("repeated poles"));
  CHECK(f.residual < 1e-2);
  for (const auto p : f.poles) CHECK(p.real() < -1.9);
  // As many inputs as states: every wish is met with orthogonal eigenvectors.
  const auto whole = place(seen_whole(bn1_A, Matrix::Identity(4, 4)), {-1, -2, {-3, 1}, {-3, -1}});
  CHECK(whole.condition < 1.0 + 1e-6);
  CHECK(whole.residual < 1e-13);
}

TEST_CASE("pole placement: a mode that no input moves must be wished, or is named", "[plant][linear]") {
  // x2 decays at -3 whatever the input does; in mixed coordinates.
  const Matrix T = rows({{1, 2, 0}, {0, 1, 1}, {1, 0, 1}}), inverse = rows({{1, -2, 2}, {1, 1, -1}, {-1, 2, 1}}) / 3.0;
  const Matrix A = T * diagonal({1, -3, 2}) * inverse;
  for (const Matrix& B : {Matrix(T * rows({{1}, {0}, {1}})), Matrix(T * rows({{1, 2}, {0, 0}, {1, -1}}))}) {
    CHECK_THAT(refusal([&] { place(seen_whole(A, B), {-1, -2, -4}); }), Contains("the mode at -3 is uncontrollable"));
    CHECK(place(seen_whole(A, B), {-1, -3, -2}).residual < 1e-12);
    CHECK_THAT(refusal([&] {
                 observer_by_poles(system_of(A.transpose(), Matrix::Zero(3, 1), B.transpose()), {-1, -2, -4});
               }),
               Contains("the mode at -3 is unobservable"));
  }
  CHECK_THAT(refusal([&] {
               place(seen_whole(A, Matrix::Identity(3, 3)), {{-1, 1}, -2, -3});
             }),
             Contains("lacks its conjugate -1 - 1j"));
  CHECK_THAT(refusal([&] { place(seen_whole(A, Matrix::Identity(3, 3)), {-2, -3}); }), Contains("2 poles were wished"));
  CHECK(place(seen_whole(Matrix(0, 0), Matrix(0, 2)), {}).K.rows() == 2);
}

// Two modes 1e-10 apart by one input: the exact gain is of 6e10, so that rounding of A - B K, 1e-5, moves its poles by hundreds.
TEST_CASE("pole placement: where rounding would place the poles it is refused with the mode", "[plant][linear]") {
  const Matrix A = diagonal({1, 1 + 1e-10});
  CHECK_THAT(refusal([&] {
               place(seen_whole(A, rows({{1}, {1}})), {-1, -2});
             }),
             Contains("the mode at 1 is all but uncontrollable") && Contains("off the wish"));
  CHECK_THAT(refusal([&] {
               observer_by_poles(system_of(A, Matrix::Zero(2, 1), rows({{1, 1}})), {-1, -2});
             }),
             Contains("the mode at 1 is all but unobservable"));
  // 1e-4 apart the gain of 6e4 rounds to 1e-11, and poles move by some 1e-6 at most.
  CHECK(place(seen_whole(diagonal({1, 1 + 1e-4}), rows({{1}, {1}})), {-1, -2}).residual < 1e-5);
}

TEST_CASE("regulator: what can't be had is refused with the mode", "[plant][linear]") {
  const Matrix one = rows({{1}}), I = Matrix::Identity(2, 2);
  const auto held = seen_whole(diagonal({2, -1}), rows({{0}, {1}}));  // nothing reaches the mode at 2
  CHECK_THAT(refusal([&] { lqr(held, I, one); }), Contains("2") && Contains("stabilise"));
  const auto integrator = seen_whole(diagonal({0, -1}), rows({{1}, {1}}));
  CHECK_THAT(refusal([&] {
               lqr(integrator, diagonal({0, 1}), one);
             }),
             Contains("mode at 0") && Contains("x1") && Contains("neither by Q nor by N"));
  CHECK_THAT(refusal([&] { lqr(integrator, I, rows({{-1}})); }),
             Contains("R must be positive definite, but has the eigenvalue -1"));
  CHECK_THAT(refusal([&] { lqr(integrator, I, rows({{0}})); }), Contains("R must be positive definite"));
  CHECK_THAT(refusal([&] {
               lqr(seen_whole(diagonal({1, .5}), rows({{1}, {1}}), .1), diagonal({0, 1}), one);
             }),
             Contains("mode at 1, on the unit circle"));
  CHECK_THAT(refusal([&] { lqr_with_integral(integrator, Matrix::Identity(4, 4), one); }),
             Contains("2 outputs") && Contains("1 input"));
  // y = x', whose zero at s = 0 stops any integral action.
  System rate = seen_whole(rows({{0, 1}, {-1, -1}}), rows({{0}, {1}}));
  rate.C = rows({{0, 1}});
  rate.D = rows({{0}});
  CHECK_THAT(refusal([&] { lqr_with_integral(rate, Matrix::Identity(3, 3), one); }), Contains("zero at s = 0"));
  CHECK(lqr(seen_whole(Matrix(0, 0), Matrix(0, 1)), Matrix(0, 0), one).K.cols() == 0);
}

TEST_CASE("stationary Kalman filter: random walk and tracking index", "[plant][linear][published]") {
  const double golden = (1 + std::sqrt(5.0)) / 2;
  const auto walk = stationary_kalman(seen_whole(rows({{1}}), rows({{0}}), 1.0), rows({{1}}), rows({{1}}));
  CHECK(walk.P(0, 0) == Approx(golden).epsilon(1e-14));
  CHECK(walk.P_filtered(0, 0) == Approx(golden - 1).epsilon(1e-14));
  CHECK(walk.M(0, 0) == Approx(golden - 1).epsilon(1e-14));
  // P.R. Kalata 1984; Y. Bar-Shalom, X.R. Li, T. Kirubarajan 2001, ch. 6: alpha and beta over the index, T = R = 1.
  const Matrix A = rows({{1, 1}, {0, 1}}), C = rows({{1, 0}}), G = rows({{.5}, {1}});
  for (const auto& [index, alpha, beta] :
       std::vector<std::array<double, 3>>{{.1, .36, .08},
                                          {.5, .6283734572049671, .3048058983988962},
                                          {1, .75, .5},
                                          {2, .8541019662496847, .7639320225002102}}) {
    const auto k =
        stationary_kalman(system_of(A, Matrix::Zero(2, 1), C, 1.0), index * index * G * G.transpose(), rows({{1}}));
    CHECK(relative(k.M, rows({{alpha}, {beta}})) < 10 * 0x1p-52 * k.condition);
    if (index == 1) {
      CHECK(relative(k.P, rows({{3, 2}, {2, 2}})) < 10 * 0x1p-52 * k.condition);
      CHECK(relative(k.P_filtered, rows({{.75, .5}, {.5, .5 + .5}})) < 10 * 0x1p-52 * k.condition);
    }
    CHECK(relative(k.L, A * k.M) < 1e-15);
  }
}

TEST_CASE("stationary Kalman filter: Nile local level and a scalar constant", "[plant][linear][published]") {
  // J. Durbin, S.J. Koopman, Time Series Analysis by State Space Methods: variances 15099 and 1469.1.
  const auto level = seen_whole(rows({{1}}), rows({{0}}), 1.0);
  const auto nile = stationary_kalman(level, rows({{1469.1}}), rows({{15099}}));
  CHECK(nile.P(0, 0) == Approx(5501.257941808476).epsilon(1e-14));
  CHECK(nile.M(0, 0) == Approx(.2670480125709303).epsilon(1e-14));
  CHECK(nile.P_filtered(0, 0) == Approx(4032.157941808476).epsilon(1e-14));
  // G. Welch, G. Bishop, UNC TR 95-041: Q 1e-5, R 0.01. Printed to 13 digits in the table.
  CHECK(stationary_kalman(level, rows({{1e-5}}), rows({{.01}})).P_filtered(0, 0) ==
        Approx(.00031126729201737).epsilon(1e-13));
}

TEST_CASE("stationary Kalman filter: continuous double integrator in closed form", "[plant][linear]") {
  // w on the speed of intensity q, v of r: L = [sqrt2 g^(1/4); g^(1/2)], g = q/r (from memory; the Butterworth pattern).
  const double q = 4, r = .25, g = std::sqrt(q / r);
  const auto k = stationary_kalman(system_of(rows({{0, 1}, {0, 0}}), rows({{0}, {1}}), rows({{1, 0}})),
                                   diagonal({0, q}), rows({{r}}));
  CHECK(relative(k.L, rows({{std::sqrt(2 * g)}, {g}})) < 10 * 0x1p-52 * k.condition);
  CHECK_THAT(refusal([&] {
               stationary_kalman(system_of(diagonal({1, -1}), Matrix::Zero(2, 0), rows({{0, 1}})),
                                 Matrix::Identity(2, 2), rows({{1}}));
             }),
             Contains("no observer follows"));
  CHECK_THAT(refusal([&] { stationary_kalman(seen_whole(rows({{0}}), rows({{1}})), rows({{0}}), rows({{1}})); }),
             Contains("mode at 0") && Contains("no noise"));
  CHECK_THAT(refusal([&] { stationary_kalman(seen_whole(rows({{0}}), rows({{1}})), rows({{-2}}), rows({{1}})); }),
             Contains("W must not be negative") && Contains("-2"));
}

TEST_CASE("observer faster than the controller: poles scale, noise costs", "[plant][linear]") {
  const auto s = system_of(rows({{0, 1}, {0, -1}}), rows({{0}, {1}}), rows({{1, 0}}));
  const Matrix K = place(s, {{-2, 2}, {-2, -2}}).K;
  const auto rows_of = sweep_factor(s, K, {2, 3, 4, 5});
  for (std::size_t i = 0; i < rows_of.size(); ++i) {
    const auto& row = rows_of[i];
    CHECK(pole_distance({row.factor * Complex(-2, 2), row.factor * Complex(-2, -2)}, row.observer.poles) < 1e-12);
    CHECK(row.slowest_s == Approx(1 / (2 * row.factor)).epsilon(1e-12));
    if (i > 0) CHECK((row.rms.array() > rows_of[i - 1].rms.array()).all());
  }
  // A first-order observer of pole -g on an integrator, e' = -g e - g v: variance g/2 per unit intensity (closed form).
  CHECK(noise_covariance(seen_whole(rows({{0}}), rows({{1}})), rows({{6}}))(0, 0) == Approx(3.0).epsilon(1e-15));
  // Discrete e+ = (1 - g) e - g v: g / (2 - g).
  CHECK(noise_covariance(seen_whole(rows({{1}}), rows({{1}}), .1), rows({{.5}}))(0, 0) ==
        Approx(1.0 / 3).epsilon(1e-15));
  CHECK_THAT(refusal([&] { noise_covariance(s, Matrix::Zero(2, 1)); }), Contains("does not decay"));
  // z -> z^factor is s -> factor s at the same period.
  const auto d = seen_whole(rows({{.9, .2}, {-.2, .9}}), Matrix::Identity(2, 2), .1);
  for (const auto p : faster_poles(d, Matrix::Zero(2, 2), 3))
    CHECK(magnitude(p - (p.imag() > 0 ? Complex(.621, .478) : Complex(.621, -.478))) < 1e-12);
  CHECK_THAT(refusal([&] { observer_faster_than(s, K, 0); }), Contains("above 0"));
}

TEST_CASE("separation: the combined loop's poles are the controller's and the observer's", "[plant][linear]") {
  System s = seen_whole(bn1_A, bn1_B);
  s.C = rows({{1, 0, 1, -1}, {0, 1, 0, 0}});
  s.D = rows({{.1, 0}, {0, .2}});
  const Matrix K = place(s, {-1, -2, {-3, 1}, {-3, -1}}).K, L = observer_by_poles(s, {-5, -6, {-7, 2}, {-7, -2}}).L;
  // Well-conditioned eigenvectors (below 1e3) times rounding of matrices of norm 50.
  CHECK(separation(s, K, L).distance < 1e-10);
}
