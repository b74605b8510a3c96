// Loops, reference gain, responses, figures and PI rules against closed forms.
#include <catch2/catch.hpp>
#include <random>

#include "plant/linear/combined.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/frequency_response.hpp"
#include "plant/linear/observer.hpp"
#include "plant/linear/pi_tuning.hpp"
#include "plant/linear/place.hpp"
#include "plant/linear/pole_set.hpp"
#include "plant/linear/reference_gain.hpp"
#include "plant/linear/response.hpp"
#include "plant/linear/step_figures.hpp"
#include "tests/plant/linear/design_matrices.hpp"

using namespace slipbench::linear;
using Catch::Matchers::Contains;

namespace {

constexpr double pi = 3.14159265358979323846;

System lag(double gain, double time) {
  return {rows({{-1 / time}}), rows({{gain / time}}), rows({{1}}), rows({{0}}), 0.0, {}, {}, {}};
}

System two_by_two() {
  return {rows({{0, 1, 0}, {-2, -3, 1}, {.5, 0, -1}}),
          rows({{0, 1}, {1, 0}, {.3, 2}}),
          rows({{1, 0, 0}, {0, 0, 1}}),
          rows({{0, 0}, {.1, 0}}),
          0.0,
          {},
          {},
          {}};
}

Matrix last(const Matrix& m, Eigen::Index columns) { return m.bottomRows(1).leftCols(columns); }

}  // namespace

TEST_CASE("reference gain: both ways agree and the output settles at the reference", "[plant][linear]") {
  auto s = two_by_two();
  for (const bool discrete : {false, true}) {
    if (discrete) s.A = Matrix::Identity(3, 3) + .1 * s.A, s.B *= .1, s.sample_period_s = .1;
    const auto poles =
        discrete ? std::vector<Complex>{.6, {.7, .1}, {.7, -.1}} : std::vector<Complex>{-4, {-3, 1}, {-3, -1}};
    const Matrix K = place(s, poles).K;
    const auto g = reference_gain(s, K);
    CAPTURE(discrete, g.condition);
    CHECK(g.difference <= 10 * 0x1p-52 * g.condition);
    CHECK(g.condition < 1e4);
    CHECK(g.warning.empty());
    for (const Eigen::Index r : {0, 1}) {
      const auto y = step_response(referenced_loop(s, K, g.N), r, .1, 200).y;  // 20 s of poles at -3: nothing is left
      CHECK((last(y, 2) - Matrix::Identity(2, 2).row(r)).norm() < 1e-12);
      CHECK((y.bottomRows(1).rightCols(2).transpose() - g.input.col(r)).norm() < 1e-12);
    }
  }
}

TEST_CASE("reference gain: refused with a sentence", "[plant][linear]") {
  const auto s = two_by_two();
  const Matrix K = Matrix::Zero(2, 3);
  System tall = s;
  tall.C = Matrix::Identity(3, 3);
  tall.D = Matrix::Zero(3, 2);
  CHECK_THAT(refusal([&] { reference_gain(tall, K); }), Contains("as many inputs as outputs, but there are 2 and 3"));
  System rate{rows({{0, 1}, {-1, -1}}), rows({{0}, {1}}), rows({{0, 1}}), rows({{0}}), 0.0, {}, {}, {}};
  CHECK_THAT(refusal([&] { reference_gain(rate, Matrix::Zero(1, 2)); }), Contains("zero at s = 0"));
  System integrator{rows({{0}}), rows({{1}}), rows({{1}}), rows({{0}}), 0.0, {}, {}, {}};
  CHECK_THAT(refusal([&] { reference_gain(integrator, Matrix::Zero(1, 1)); }),
             Contains("closed loop has a pole at s = 0"));
}

TEST_CASE("loops: observer-based feedback equals state feedback when the first estimate is right", "[plant][linear]") {
  const auto s = two_by_two();
  const Matrix K = place(s, {-4, {-3, 1}, {-3, -1}}).K, N = reference_gain(s, K).N,
               L = observer_by_poles(s, {-9, {-8, 1}, {-8, -1}}).L;
  const auto direct = step_response(referenced_loop(s, K, N), 0, .01, 600);
  const auto observed = step_response(observed_loop(s, K, N, L), 0, .01, 600);
  // Same equations in other coordinates: rounding over 600 steps.
  CHECK((direct.y - observed.y).cwiseAbs().maxCoeff() < 1e-11);
  // A wrong first estimate is forgotten at the observer's poles.
  Vector off = Vector::Zero(6);
  off(3) = 1;
  const auto wrong = step_response(observed_loop(s, K, N, L), 0, .01, 600, 1.0, off);
  CHECK((wrong.y - direct.y).cwiseAbs().maxCoeff() > 1e-3);
  CHECK((wrong.y - direct.y).bottomRows(1).norm() < 1e-5);
}

TEST_CASE("loops: integral action leaves no error against a constant disturbance or a wrong plant", "[plant][linear]") {
  auto s = two_by_two();
  for (const bool discrete : {false, true}) {
    if (discrete) s.A = Matrix::Identity(3, 3) + .1 * s.A, s.B *= .1, s.sample_period_s = .1;
    const auto f = lqr_with_integral(s, Matrix::Identity(5, 5), Matrix::Identity(2, 2));
    const auto loop = integral_loop(s, f.K);
    System wrong = s;
    wrong.B *= 1.2;
    for (const auto& closed : {loop, integral_loop(wrong, f.K)}) {
      // r on channel 0; r on 1; the disturbance at each input leaves nothing: the slowest pole, near -0.08, over 1000 s.
      CHECK((last(step_response(closed, 0, .1, 10000).y, 2) - rows({{1, 0}})).norm() < 1e-10);
      CHECK((last(step_response(closed, 1, .1, 10000).y, 2) - rows({{0, 1}})).norm() < 1e-10);
      CHECK(last(step_response(closed, 2, .1, 10000).y, 2).norm() < 1e-10);
    }
    CHECK(pole_distance(f.poles, eigenvalues(loop.A)) < 1e-10);
  }
}

TEST_CASE("responses: lag of first order in closed form", "[plant][linear]") {
  const double T = .3, w = 7;
  const auto s = lag(2, T);
  const auto step = step_response(s, 0, .05, 40, 1.5);
  const auto sine = sine_response(s, 0, w, .05, 400);
  for (Eigen::Index k = 0; k <= 40; ++k)
    CHECK(step.y(k, 0) == Approx(3 * (1 - std::exp(-.05 * static_cast<double>(k) / T))).margin(1e-14));
  for (Eigen::Index k = 0; k <= 400; ++k) {
    const double t = .05 * static_cast<double>(k), a = 1 + w * w * T * T;
    CHECK(sine.y(k, 0) ==
          Approx(2 / a * (std::sin(w * t) - w * T * std::cos(w * t) + w * T * std::exp(-t / T))).margin(1e-13));
  }
  CHECK(step.time_s[40] == 40 * .05);
  // Held samples: superposition of two steps.
  Matrix u(11, 1);
  for (Eigen::Index k = 0; k < 11; ++k) u(k, 0) = k < 5 ? 1 : -2;
  const auto free = response_to(s, u, .1);
  CHECK(free.y(10, 0) == Approx(2 * (1 - std::exp(-1 / T)) - 6 * (1 - std::exp(-.5 / T))).margin(1e-14));
  CHECK_THAT(refusal([&] { step_response(s, 1, .1, 3); }), Contains("no input 2"));
  CHECK_THAT(refusal([&] { step_response(s, 0, 0, 3); }), Contains("above 0 s"));
}

TEST_CASE("noise response: variance is the Lyapunov equation's", "[plant][linear]") {
  // White noise of intensity S through 1 / (1 + s T) has variance S / (2 T) (closed form); held samples of variance S / h add (h / T)^2 / 12.
  const double T = .1, h = .002, S = 3;
  const Eigen::Index steps = 200000;
  std::mt19937_64 draw(5);
  Matrix u(steps + 1, 1);
  for (Eigen::Index k = 0; k <= steps; ++k) {
    double sum = -6;  // twelve uniform draws: variance 1
    for (int i = 0; i < 12; ++i) sum += static_cast<double>(draw() >> 11) * 0x1p-53;
    u(k, 0) = sum * std::sqrt(S / h);
  }
  const Matrix y = response_to(lag(1, T), u, h).y.bottomRows(steps - 1000);
  // steps h / (2 T) = 2000 independent values: 1 / sqrt(1000) relative, three times that.
  CHECK(y.squaredNorm() / static_cast<double>(y.size()) == Approx(S / (2 * T)).epsilon(.1));
}

TEST_CASE("step figures: oscillator of second order in closed form", "[plant][linear]") {
  const double d = .5, w = 4, damped = w * std::sqrt(1 - d * d);
  const System s{
      rows({{0, 1}, {-w * w, -2 * d * w}}), rows({{0}, {w * w}}), rows({{1, 0}}), rows({{0}}), 0.0, {}, {}, {}};
  const double h = 1e-3;
  const auto f = step_figures(step_response(s, 0, h, 6000), 0, 1.0, 1.0);
  // Peak by a parabola: error (h w)^4 order, below 1e-9; crossings linear: (h w)^2 / 8 of the way over the slope.
  CHECK(f.overshoot == Approx(std::exp(-pi * d / std::sqrt(1 - d * d))).margin(1e-8));
  CHECK(f.peak_time_s == Approx(pi / damped).margin(1e-6));
  const auto y = [&](double t) {
    return 1 - std::exp(-d * w * t) * (std::cos(damped * t) + d * w / damped * std::sin(damped * t));
  };
  const auto crossing = [&](double level, double low, double high) {
    for (int i = 0; i < 60; ++i) ((y(.5 * (low + high)) < level) == (y(low) < level) ? low : high) = .5 * (low + high);
    return low;
  };
  CHECK(f.rise_s == Approx(crossing(.9, 0, pi / damped) - crossing(.1, 0, pi / damped)).margin(1e-5));
  // The last of the swings beyond 2 % at d = 0.5 is the first trough (exp(-2 pi d / ..) = 2.66 %): it ends before the next rise.
  CHECK(f.settling_s == Approx(crossing(.98, 2 * pi / damped, 3 * pi / damped)).margin(1e-5));
  CHECK(f.steady_error == 0.0);
  const auto lagging = step_figures(step_response(lag(.8, 1), 0, .01, 500), 0, 1.0);
  CHECK(lagging.overshoot == 0.0);
  CHECK(lagging.steady_error == Approx(1 - .8 * (1 - std::exp(-5.0))).epsilon(1e-12));
}

TEST_CASE("step figures: a discrete system's are its samples'", "[plant][linear]") {
  // Dead beat, 0, 1, 1, 1, ...: nothing lies beyond; from 10 % to 90 % within one sample, inside +-2 % from the first on.
  const System dead{rows({{0}}), rows({{1}}), rows({{1}}), rows({{0}}), 0.1, {}, {}, {}};
  const auto f = step_figures(step_response(dead, 0, 0, 30), 0, 1.0, 1.0);
  CHECK(f.overshoot == 0.0);
  CHECK(f.peak_time_s == 0.1);
  CHECK(f.rise_s == 0.0);
  CHECK(f.settling_s == 0.1);
  // y[k] = 1 - 2^-k by hand: 10 % from k = 1, 90 % from k = 4, within 2 % from k = 6.
  const System half{rows({{.5}}), rows({{.5}}), rows({{1}}), rows({{0}}), 1.0, {}, {}, {}};
  const auto slow = step_figures(step_response(half, 0, 0, 60), 0, 1.0, 1.0);
  CHECK(slow.rise_s == 3.0);
  CHECK(slow.settling_s == 6.0);
  // y = 0, 1.5, 0.75, 1.125, ... (pole -1/2, by hand): half of the way too far.
  const System swings{rows({{-.5}}), rows({{1.5}}), rows({{1}}), rows({{0}}), 1.0, {}, {}, {}};
  CHECK(step_figures(step_response(swings, 0, 0, 60), 0, 1.0, 1.0).overshoot == Approx(.5).epsilon(1e-15));
}

TEST_CASE("frequency response: closed forms, poles refused, phase followed", "[plant][linear]") {
  // 1 / (s + 1)^3 in companion form.
  const System s{rows({{0, 1, 0}, {0, 0, 1}, {-1, -3, -3}}),
                 rows({{0}, {0}, {1}}),
                 rows({{1, 0, 0}}),
                 rows({{0}}),
                 0.0,
                 {},
                 {},
                 {}};
  for (const auto& p : frequency_response(s, logarithmic(.01, 100, 41))) {
    const Complex g = 1.0 / std::pow(Complex(1, p.frequency_rad_s), 3);
    CHECK(std::abs(p.G(0, 0) - g) < 1e-13 * std::abs(g) * (1 + 10 * p.frequency_rad_s));  // condition of jw I - A
    CHECK(p.phase_rad(0, 0) == Approx(-3 * std::atan(p.frequency_rad_s)).margin(1e-10));
  }
  CHECK_THAT(
      refusal([] {
        frequency_response({rows({{0, 2}, {-2, 0}}), rows({{0}, {1}}), rows({{1, 0}}), {}, 0.0, {}, {}, {}}, 2.0);
      }),
      Contains("a pole at 0 + 2j"));
  // Discrete delay of two steps: gain 1, phase -2 w T.
  const System delay{rows({{0, 1}, {0, 0}}), rows({{0}, {1}}), rows({{1, 0}}), rows({{0}}), .1, {}, {}, {}};
  const auto p = frequency_response(delay, 3.0);
  CHECK(p.gain(0, 0) == Approx(1).epsilon(1e-15));
  CHECK(p.phase_rad(0, 0) == Approx(-.6).epsilon(1e-14));
  // The steady sine is the frequency response's: after 40 time constants nothing else is left.
  const auto wave = sine_response(lag(2, .1), 0, 5, .01, 800);
  const auto at = frequency_response(lag(2, .1), 5.0);
  CHECK(wave.y(800, 0) == Approx(at.gain(0, 0) * std::sin(5 * 8.0 + at.phase_rad(0, 0))).margin(1e-12));
}

TEST_CASE("magnitude optimum: 4.3 % overshoot, 4.7 and 8.4 small lags", "[plant][linear][published]") {
  // C. Kessler 1958; figures as in any text on drives (W. Leonhard, Control of Electrical Drives).
  const double e = .002, T = .05, gain = 4;
  const auto t = magnitude_optimum(gain, T, e);
  const System plant{
      rows({{-1 / T, 1 / T}, {0, -1 / e}}), rows({{0}, {gain / e}}), rows({{1, 0}}), rows({{0}}), 0.0, {}, {}, {}};
  const auto loop = pi_loop(plant, t.gain, t.integral_time_s);
  const auto r = step_response(loop, 0, e / 1000, 20000);
  const auto f = step_figures(r, 0, 1.0, 1.0);
  CHECK(f.overshoot == Approx(std::exp(-pi)).margin(1e-7));  // 4.32 %
  double first = 0;
  while (r.y(static_cast<Eigen::Index>(first), 0) < 1) ++first;
  CHECK(first / 1000 == Approx(1.5 * pi).margin(2e-3));  // 4.71 lags to the first crossing, on a grid of 1e-3
  CHECK(f.settling_s / e == Approx(8.43).margin(.01));   // printed with two digits
  // The open loop at the stated crossover: gain 1 and the stated margin.
  const double w = t.crossover_rad_s;
  const Complex open = t.gain * (1.0 + 1.0 / Complex(0, w * t.integral_time_s)) * frequency_response(plant, w).G(0, 0);
  CHECK(std::abs(open) == Approx(1).epsilon(1e-12));
  CHECK(std::arg(open) + pi == Approx(t.phase_margin_rad).epsilon(1e-12));
  CHECK(t.phase_margin_rad * 180 / pi == Approx(65.5).margin(.05));
}

TEST_CASE("symmetric optimum: 43.4 % overshoot, 8.1 % with filtered reference, margin over a",
          "[plant][linear][published]") {
  // C. Kessler 1958; J.W. Umland, M. Safiuddin 1990 for a.
  const double e = .002, T = .3, gain = 4;
  const System plant{
      rows({{0, 1 / T}, {0, -1 / e}}), rows({{0}, {gain / e}}), rows({{1, 0}}), rows({{0}}), 0.0, {}, {}, {}};
  for (const double a : {2.0, 2.4, 3.0, 4.0}) {
    const auto t = symmetric_optimum(gain, T, e, a);
    const double w = t.crossover_rad_s;
    const Complex open =
        t.gain * (1.0 + 1.0 / Complex(0, w * t.integral_time_s)) * frequency_response(plant, w).G(0, 0);
    CHECK(std::abs(open) == Approx(1).epsilon(1e-12));
    CHECK(std::arg(open) + pi == Approx(std::atan((a * a - 1) / (2 * a))).epsilon(1e-11));
    CHECK(t.phase_margin_rad == Approx(std::atan((a * a - 1) / (2 * a))).epsilon(1e-14));
    // A triple pole at a = 3 splits by the cube root of the rounding, 1e-5.
    const auto loop = pi_loop(plant, t.gain, t.integral_time_s);
    CHECK(pole_distance(t.poles, eigenvalues(loop.A)) < (a == 3 ? 1e-4 : 1e-11));
    if (a != 2) continue;
    // Printed with three digits.
    CHECK(step_figures(step_response(loop, 0, e / 200, 20000), 0, 1.0, 1.0).overshoot == Approx(.434).margin(5e-4));
    const auto filtered = pi_loop(plant, t.gain, t.integral_time_s, t.prefilter_s);
    CHECK(step_figures(step_response(filtered, 0, e / 200, 20000), 0, 1.0, 1.0).overshoot == Approx(.081).margin(5e-4));
  }
  CHECK_THAT(refusal([] { symmetric_optimum(1, 1, 1, 1.0); }), Contains("above 1"));
  CHECK_THAT(refusal([] { magnitude_optimum(0, 1, 1); }), Contains("other than 0"));
}
