// Is the filter as sure as it has a right to be? Plant equal to the filter's own discrete model, process
// noise of the filter's Q, x0 drawn from P0: normalised errors must follow chi-square. And: the covariance
// stays positive for good.
#include <Eigen/Dense>
#include <catch2/catch.hpp>
#include <random>

#include "estimators/extended_kalman.hpp"
#include "sim/linear/turning_state.hpp"
#include "tests/estimators/machines.hpp"

using namespace slipbench;
using namespace slipbench::tests;

namespace {

Vec2<double> turned_by(const Vec2<double>& a, double angle) { return turn_forward(sincos(angle), a); }
TurningPoint turning_at(const EstimatorSetup& setup, double flux, double torque, double w_r) {
  return turning_point(setup.circuit, setup.control_period_s, flux / to_inverse_gamma(setup.circuit).flux_ratio, torque,
                       w_r);
}

using Vector5 = Eigen::Matrix<double, 5, 1>;
using Matrix5 = Eigen::Matrix<double, 5, 5>;

Vector5 vector_of(const KalmanVector<double>& x) {
  return (Vector5() << x.current.x, x.current.y, x.flux.x, x.flux.y, x.speed).finished();
}
Matrix5 matrix_of(const Symmetric6<double>& P) {
  Matrix5 out;
  for (std::size_t r = 0; r < 5; ++r) {
    for (std::size_t c = 0; c < 5; ++c) out(Eigen::Index(r), Eigen::Index(c)) = P(r, c);
  }
  return out;
}
// Smallest eigenvalue of the correlation matrix over the first n states.
template <class Real>
double least_correlation(const Symmetric6<Real>& P, Eigen::Index n) {
  Eigen::MatrixXd C(n, n);
  for (Eigen::Index r = 0; r < n; ++r) {
    for (Eigen::Index c = 0; c < n; ++c) {
      const auto a = std::size_t(r), b = std::size_t(c);
      C(r, c) = double(P(a, b)) / std::sqrt(double(P(a, a)) * double(P(b, b)));
    }
  }
  return C.selfadjointView<Eigen::Upper>().eigenvalues().minCoeff();
}

struct Consistency {
  std::vector<double> nees;  // mean over runs, by tick
  double nis = 0.0;          // mean over runs and ticks
};

// `told`: what the filter believes; `sensors`: what there really is.
Consistency consistency(int told, int sensors, int runs, int ticks, unsigned seed) {
  EstimatorSetup setup = setup_of(barut_3kW());
  setup.current_sensors = told;
  const auto c = ExtendedKalman::prepare(setup, {});
  const BelievedMachine<double>& m = c.model.machine;
  const double flux = nominal_rotor_flux(setup), rated = setup.nameplate.speed_rad_s() * m.pole_pairs;
  const TurningPoint p = turning_at(setup, flux, 0.5 * setup.nameplate.torque_Nm, 0.6 * rated);
  std::mt19937_64 random(seed);
  std::normal_distribution<double> normal;
  Consistency out;
  out.nees.assign(std::size_t(ticks), 0.0);
  for (int run = 0; run < runs; ++run) {
    auto state = ExtendedKalman::begin(setup, c);
    state.x = {p.current, p.flux_ratio * p.rotor_flux, p.w_r, 0.0};
    KalmanVector<double> truth = state.x;
    const auto shake = [&](const std::array<double, 5>& deviation) {
      truth.current = truth.current + Vec2<double>{deviation[0] * normal(random), deviation[1] * normal(random)};
      truth.flux = truth.flux + Vec2<double>{deviation[2] * normal(random), deviation[3] * normal(random)};
      truth.speed += deviation[4] * normal(random);
    };
    std::array<double, 5> start{}, process{};
    for (std::size_t n = 0; n < 5; ++n) {
      start[n] = std::sqrt(state.P(n, n));
      process[n] = std::sqrt(c.process[n]);
    }
    shake(start);
    for (int k = 0; k < ticks; ++k) {
      // The voltage of the steady point, and on top a slow beat: flux and torque move all the time.
      const double t = k * m.period, beat = 1.0 + 0.1 * std::sin(40.0 * t);
      const Vec2<double> u = beat * turned_by(p.voltage, p.w_s * t);
      if (k > 0) {
        truth = predict_with_jacobian(c.model, truth, u).x;
        shake(process);
        ExtendedKalman::predict(state.x, state.P, u, c);
      }
      const double s = setup.current_noise_A, a = s * normal(random), b = s * normal(random), d = s * normal(random);
      const Vec2<double> noise = sensors == 2 ? clarke_two(a, b) : clarke(Phases<double>{a, b, d});
      const auto in = ExtendedKalman::correct(state.x, state.P, truth.current + noise, c);
      Eigen::Matrix2d S;
      S << in.S_diagonal.x, in.S_cross, in.S_cross, in.S_diagonal.y;
      const Eigen::Vector2d y(in.y.x, in.y.y);
      out.nis += y.dot(S.ldlt().solve(y)) / (double(runs) * ticks);
      const Vector5 e = vector_of(truth) - vector_of(state.x);
      out.nees[std::size_t(k)] += e.dot(matrix_of(state.P).ldlt().solve(e)) / runs;
    }
  }
  return out;
}
double share_inside(const std::vector<double>& values, double low, double high) {
  long inside = 0;
  for (const double v : values) inside += v >= low && v <= high;
  return double(inside) / double(values.size());
}
// Two-sided 95 % band of the mean of n chi-square values of 2 degrees, n large: 2 +- 1.96 sqrt(4 / n).
bool nis_inside(double nis, double n) { return std::fabs(nis - 2.0) < 1.959964 * std::sqrt(4.0 / n); }

}  // namespace

// 95 % band of the mean of 50 chi-square values of 5 degrees: chi2(250) / 50. Y. Bar-Shalom, X.R. Li, T.
// Kirubarajan, "Estimation with Applications to Tracking and Navigation", 2001, sec. 5.4.
TEST_CASE("extended_kalman: normalised errors follow chi-square on its own model", "[estimators][consistency]") {
  constexpr int runs = 50, ticks = 1000;
  for (const int sensors : {3, 2}) {
    const Consistency c = consistency(sensors, sensors, runs, ticks, 2);
    const double share = share_inside(c.nees, 4.161956, 5.913773);
    INFO(sensors << " sensors: NEES inside at " << 100.0 * share << " % of ticks, NIS " << c.nis);
    // 95 % is what an exact filter gets on average; ticks are correlated over some 10 ms, so single seeds
    // scatter (0.91 to 0.98). The seed is fixed; the average over many is the next test.
    CHECK(share >= 0.95);
    CHECK(nis_inside(c.nis, double(runs) * ticks));
  }
}

TEST_CASE("extended_kalman: normalised errors over twenty seeds", "[estimators][consistency][long]") {
  for (const int sensors : {3, 2}) {
    double share = 0.0, nis = 0.0;
    for (unsigned seed = 1; seed <= 20; ++seed) {
      const Consistency c = consistency(sensors, sensors, 50, 1000, seed);
      share += share_inside(c.nees, 4.161956, 5.913773) / 20.0;
      nis += c.nis / 20.0;
    }
    INFO(sensors << " sensors: NEES inside at " << 100.0 * share << " % of ticks, NIS " << nis);
    CHECK(std::fabs(share - 0.95) < 0.015);  // single seeds scatter by 0.017 rms: 4 deviations of the mean of 20
    CHECK(nis_inside(nis, 20.0 * 50.0 * 1000.0));
  }
}

TEST_CASE("extended_kalman: a filter told wrongly about its sensors is found inconsistent",
          "[estimators][consistency]") {
  constexpr int runs = 50, ticks = 1000;
  const Consistency c = consistency(3, 2, runs, ticks, 2);
  CHECK_FALSE(nis_inside(c.nis, double(runs) * ticks));
}

namespace {

// A machine in steady rotation with noise, over and over (or dead: noise alone); smallest correlation
// eigenvalue met, looked at now and then.
template <class Real>
double least_over(std::int64_t steps, double shaft, bool live = true) {
  const EstimatorSetup setup = setup_of(barut_3kW());
  Settings given;
  given.set("load_torque", shaft);
  const auto c = ExtendedKalman::prepare(setup, given);
  const BelievedMachine<double>& m = c.model.machine;
  const double flux = nominal_rotor_flux(setup), w_s = rad_per_turn * 20.0, gain = live ? 1.0 : 0.0;
  constexpr std::size_t period = 500;  // one turn at 20 Hz
  const TurningPoint p = turning_at(setup, flux, 5.0, w_s - m.R_R * 5.0 / (m.torque_factor * flux * flux));
  std::mt19937_64 random(3);
  std::normal_distribution<double> normal(0.0, setup.current_noise_A);
  std::vector<Sample<Real>> samples(period);
  for (std::size_t k = 0; k < period; ++k) {
    const double angle = w_s * m.period * double(k);
    const Vec2<double> i = gain * turned_by(p.current, angle) + Vec2<double>{normal(random), normal(random)};
    const Vec2<double> u = gain * turned_by(p.voltage, angle);
    samples[k].u_alpha = Real(u.x);
    samples[k].u_beta = Real(u.y);
    samples[k].i_alpha = Real(i.x);
    samples[k].i_beta = Real(i.y);
  }
  const auto constants = in_number<ExtendedKalman::Constants<Real>, Real>(c);
  auto state = in_number<ExtendedKalman::State<Real>, Real>(ExtendedKalman::begin(setup, c));
  double least = 1.0;
  for (std::int64_t k = 0; k < steps; ++k) {
    ExtendedKalman::step(state, samples[std::size_t(k) % period], constants);
    if (k % 997 == 0) least = std::min(least, least_correlation(state.P, shaft > 0.5 ? 6 : 5));
  }
  return least;
}

}  // namespace

// Symmetric by construction: each entry is computed once. Positive: the smallest eigenvalue of the correlation
// matrix.
TEST_CASE("extended_kalman: covariance stays positive", "[estimators][kalman]") {
  for (const double shaft : {0.0, 1.0}) {
    // Measured 0.3 and steady: 0.1 tells a drift from scatter.
    CHECK(least_over<double>(200'000, shaft) > 0.1);
    CHECK(least_over<float>(200'000, shaft) > 0.1);
    // A dead machine says nothing about speed: its variance runs up to the bound and must stop there.
    CHECK(least_over<double>(200'000, shaft, false) > 0.01);
    CHECK(least_over<float>(200'000, shaft, false) > 0.01);
  }
}
TEST_CASE("extended_kalman: covariance stays positive over 1e7 steps", "[estimators][kalman][long]") {
  for (const double shaft : {0.0, 1.0}) {
    const double least = least_over<double>(10'000'000, shaft);
    INFO("least eigenvalue of the correlation " << least);
    CHECK(least > 0.1);  // as after 2e5 steps: no drift
  }
}
