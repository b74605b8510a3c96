// The estimators' stability map: poles by dual numbers against central differences, and what a map must show.
#include <Eigen/Eigenvalues>
#include <catch2/catch.hpp>

#include "estimators/methods.hpp"
#include "plant/linear/exponential.hpp"
#include "plant/linear/machine_system.hpp"
#include "sim/engine/start.hpp"
#include "sim/linear/error_dynamics.hpp"
#include "sim/linear/estimator_map.hpp"
#include "sim/scenario/read.hpp"
#include "tests/estimators/machines.hpp"

using namespace slipbench;
using namespace slipbench::tests;

namespace {

Scenario demo(const char* name, const std::vector<Override>& overrides = {}) {
  return read_scenario(SLIPBENCH_SOURCE_DIR "/configs/scenarios/" + std::string(name), overrides);
}

// Largest distance of a pole of `a` to its nearest one of `b`.
double farthest(const std::vector<linear::Complex>& a, const std::vector<linear::Complex>& b) {
  double most = 0.0;
  for (const auto& pole : a) {
    double nearest = 1e300;
    for (const auto& other : b) nearest = std::min(nearest, std::abs(pole - other));
    most = std::max(most, nearest);
  }
  return most;
}

}  // namespace

TEST_CASE("error dynamics: the Jacobian equals central differences", "[sim][linear]") {
  const EstimatorSetup setup = setup_of(hinkkanen_2kW());
  each_estimator_method([&]<class Method>() {
    const auto c = Method::prepare(setup, {});
    for (const auto& [torque, w_r] : {std::pair{5.0, 250.0}, {-14.0, 60.0}, {10.0, -280.0}}) {
      const TurningPoint p = turning_point(setup.circuit, setup.control_period_s, 0.9, torque, w_r);
      const ErrorMap<Method> map(c, p);
      auto s = Method::begin(setup, c);
      for (int k = 0; k < 500; ++k) {
        tell_truth("", s, p);
        s = map.next(s);
      }
      tell_truth("", s, p);
      const auto J = map.linearised(s).J;
      for (std::size_t n = 0; n < ErrorMap<Method>::N; ++n) {
        auto above = s, below = s;
        const double size = std::fabs(*numbers_of<double>(s)[n]), h = 1e-6 * (size > 0.0 ? size : 1.0);
        *numbers_of<double>(above)[n] += h;
        *numbers_of<double>(below)[n] -= h;
        const auto high = map.next(above), low = map.next(below);
        const auto up = numbers_of<const double>(high), down = numbers_of<const double>(low);
        for (std::size_t r = 0; r < ErrorMap<Method>::N; ++r) {
          const double slope = (*up[r] - *down[r]) / (2.0 * h), entry = J(Eigen::Index(r), Eigen::Index(n));
          // Rounding of the two values over the step, and the third derivative's h^2 / 6, small against 1e-6.
          const double rounding = 4.4e-16 * (std::fabs(*up[r]) + std::fabs(*down[r]) + 1.0) / h;
          INFO(Method::kind << ", number " << r << " by " << n << ", torque " << torque);
          CHECK(std::fabs(slope - entry) <= 1e-6 * std::fabs(entry) + 10.0 * rounding + 1e-9);
        }
      }
    }
  });
}

TEST_CASE("error dynamics: the Kalman filter's poles are those of the stationary filter", "[sim][linear]") {
  // At the truth the innovation is zero, so the state's error has the poles of (1 - K H) F with K of the stationary Riccati equation, and the
  // covariance's those poles' products: solved here by plain iteration of textbook equations on dense matrices.
  const EstimatorSetup setup = setup_of(krause_3hp());
  const auto c = ExtendedKalman::prepare(setup, {});
  const TurningPoint p = turning_point(setup.circuit, setup.control_period_s, 0.45, 8.0, 150.0);
  const ErrorDynamics e = error_dynamics<ExtendedKalman>(c, ExtendedKalman::begin(setup, c), p);
  REQUIRE(e.settled());
  using Matrix = Eigen::MatrixXd;
  auto s = ExtendedKalman::begin(setup, c);
  tell_truth("", s, p);
  // d x- / d x at the truth, seen from the turning frame.
  const SinCos<double> by = sincos(p.w_s * p.period_s);
  const Vec2<double> u = turn_forward(by, p.voltage);
  const auto F = predict_with_jacobian(c.model, s.x, u).F;
  Matrix A = Matrix::Zero(5, 5), turn = Matrix::Identity(5, 5);
  for (int r = 0; r < 4; ++r) {
    for (int k = 0; k < 5; ++k) A(r, k) = F.electrical[std::size_t(r)][std::size_t(k)];
  }
  A(4, 4) = 1.0;
  for (const int first : {0, 2}) {
    turn(first, first) = turn(first + 1, first + 1) = by.cos;
    turn(first, first + 1) = by.sin;
    turn(first + 1, first) = -by.sin;
  }
  A = turn * A;
  Matrix Q = Matrix::Zero(5, 5), P = Matrix::Identity(5, 5), H = Matrix::Zero(2, 5), R = Matrix::Zero(2, 2), K;
  for (int n = 0; n < 5; ++n) Q(n, n) = c.process[std::size_t(n)];
  H(0, 0) = H(1, 1) = 1.0;
  R(0, 0) = R(1, 1) = c.noise_diagonal.x;
  for (int k = 0; k < 200000; ++k) {  // 20 s: the slowest filter pole is about 10 1/s
    const Matrix ahead = A * P * A.transpose() + Q, S = H * ahead * H.transpose() + R;
    K = ahead * H.transpose() * S.inverse();
    P = (Matrix::Identity(5, 5) - K * H) * ahead;
    P = 0.5 * (P + P.transpose()).eval();
  }
  const Eigen::VectorXcd z = ((Matrix::Identity(5, 5) - K * H) * A).eval().eigenvalues();
  const std::vector<linear::Complex> expected(z.data(), z.data() + z.size());
  double slowest = 0.0;
  for (const auto& pole : expected) slowest = std::max(slowest, std::abs(pole));
  // The filter's series leaves (|A| T)^4 / 24 = 7e-7 of a state at 100 us, by which its fixed point differs from the truth.
  CHECK(farthest(expected, e.poles) < 1e-6);
  CHECK(e.slowest_per_s == Approx(std::log(slowest) / p.period_s).epsilon(1e-4));
}

TEST_CASE("estimator map: shipped observers are stable outside the blind band, the loss lies inside it",
          "[sim][linear]") {
  const Scenario s = demo("loaded_reversal.toml");
  EstimatorMapOptions options;
  options.plane = {0.3, 1.2, 25, 13};
  for (std::size_t which = 0; which < s.estimators.size(); ++which) {
    const EstimatorMap map = estimator_map(s, which, options);
    INFO(map.kind);
    REQUIRE(map.points.size() == map.plane.points());
    const double p = s.machine.circuit().pole_pairs;
    for (std::size_t i = 0; i < map.plane.speeds; ++i) {
      for (std::size_t k = 0; k < map.plane.torques; ++k) {
        const EstimatorPoint& point = map.points[map.plane.index(i, k)];
        const double f_s =
            p * (map.plane.speed_rpm(i) - map.lines.lost[k].speed_rpm) / 60.0;  // full flux at these speeds
        INFO("f_s " << f_s << " Hz, slowest " << point.slowest_per_s);
        if (std::fabs(f_s) >= 0.5) CHECK(point.state == EstimatorPoint::State::stable);
        if (std::fabs(f_s) >= 0.5) CHECK(std::fabs(point.speed_error_rpm) < 0.5);
      }
    }
  }
}

// e(k+1) = (I - M C) e^(A T) e(k) with the gain of plant/linear/current_loop.hpp, turned by -w_s T: textbook (D.G. Luenberger, IEEE TAC 16,
// 1971), on dense matrices. The observer's series leaves 2e-12 of a state a period; eigenvalues of a matrix of norm 1 follow it.
TEST_CASE("error dynamics: with a measured speed, the poles are those of the linear observer", "[sim][linear]") {
  const EstimatorSetup setup = setup_of(hinkkanen_2kW());
  const Settings gains = LinearObserver::with_gains(setup, {});
  const auto c = LinearObserver::prepare(setup, gains);
  const double T = setup.control_period_s;
  for (const auto& [torque, w_r] : {std::pair{5.0, 250.0}, {-14.0, 0.0}, {10.0, -280.0}}) {
    const TurningPoint p = turning_point(setup.circuit, T, 0.9, torque, w_r);
    const ErrorDynamics e = error_dynamics<LinearObserver>(c, LinearObserver::begin(setup, c), p);
    INFO("torque " << torque << ", speed " << w_r);
    REQUIRE(e.settled());
    const auto g = at(c.observer.gain, std::fabs(w_r));
    const double turn = w_r < 0.0 ? -1.0 : 1.0;
    linear::Matrix M(4, 2);
    M << g[0], -turn * g[1], turn * g[1], g[0], g[2], -turn * g[3], turn * g[3], g[2];
    linear::MachinePoint held;
    held.circuit = setup.circuit;
    held.speed_rad_s = w_r / p.pole_pairs;
    const linear::Matrix ahead = linear::exponential(linear::machine_at_speed(held).A * T);
    linear::Matrix error = ahead - M * ahead.topRows(2), back = linear::Matrix::Zero(4, 4);
    const SinCos<double> by = sincos(p.w_s * T);
    for (const int first : {0, 2}) back.block(first, first, 2, 2) << by.cos, by.sin, -by.sin, by.cos;
    const Eigen::VectorXcd z = (back * error).eigenvalues();
    CHECK(farthest({z.data(), z.data() + z.size()}, e.poles) < 1e-9);
    CHECK(e.stable());
  }
  const Scenario s = demo("current_loop_observer.toml");
  const EstimatorMapMaker maker(s, 0);
  for (const double speed : {-700.0, 0.0, 40.0, 700.0})
    CHECK(maker.at(speed, 10.0).state == EstimatorPoint::State::stable);
}

TEST_CASE("estimator map: a wrong belief shows as a steady speed error", "[sim][linear]") {
  // Slip goes with the believed rotor resistance: 20 % too much at stator frequency and flux that are right is 20 % of the slip. Flux and
  // frequency stay right at high speed, where the voltage decides: within 5 % of that error.
  const Scenario s = demo("loaded_reversal.toml", {{"belief.rotor_resistance", "1.2"}});
  const EstimatorMapMaker maker(s, 1);
  const double torque = 15.0, speed = 1000.0, flux = maker.flux().at(speed * rad_s_in_rpm, torque);
  const Circuit<double> c = s.machine.circuit();
  const double slip_rpm = -linear::speed_at_frequency(c, flux, torque, 0.0) / c.pole_pairs / rad_s_in_rpm;
  const EstimatorPoint point = maker.at(speed, torque);
  CHECK(point.state == EstimatorPoint::State::stable);
  CHECK(point.speed_error_rpm == Approx(-0.2 * slip_rpm).epsilon(0.05));
}

TEST_CASE("estimator map: of several steady estimates, the one that a run of the estimator comes to", "[sim][linear]") {
  // At rest under load with the magnetising inductance believed 10 % too high: the estimator itself, started at the truth, is the judge.
  const Scenario s = demo("fan_field_weakening.toml");
  REQUIRE(s.estimators[1].kind == "reduced_order");
  const EstimatorMapMaker maker(s, 1);
  const Circuit<double> truth = s.machine.circuit();
  EstimatorSetup setup = estimator_setup(s, 0.0);
  const auto c = ReducedOrder::prepare(setup, {});
  for (const double torque : {9.855, 13.14, 17.52, 20.805}) {
    const TurningPoint p = turning_point(truth, setup.control_period_s, maker.flux().at(0.0, torque), torque, 0.0);
    const ErrorMap<ReducedOrder> map(c, p);
    auto state = held_at_truth<ReducedOrder>(c, ReducedOrder::begin(setup, c), p, 10);
    for (int k = 0; k < 100000; ++k) state = map.next(state);  // 10 s: its slowest pole here is 4 to 10 1/s
    const EstimatorPoint point = maker.at(0.0, torque);
    INFO("torque " << torque << ": slowest " << point.slowest_per_s);
    CHECK(point.state == EstimatorPoint::State::stable);
    CHECK(point.speed_error_rpm * rad_s_in_rpm == Approx(state.speed / truth.pole_pairs).epsilon(1e-6));
  }
}

TEST_CASE("estimator map: what the drive can't reach is told, not mapped", "[sim][linear]") {
  const EstimatorMapMaker maker(demo("fan_field_weakening.toml"), 0);
  CHECK(maker.at(2300.0, 21.0).state == EstimatorPoint::State::beyond);
  CHECK(maker.at(2300.0, 5.0).state == EstimatorPoint::State::stable);
}

TEST_CASE("estimator map: what can't be mapped is refused by name", "[sim][linear]") {
  Scenario s = demo("loaded_reversal.toml");
  s.estimators[0].kind = "somebody_elses";
  CHECK_THROWS_WITH(EstimatorMapMaker(s, 0), Catch::Contains("somebody_elses"));
  EstimatorMapOptions options;
  options.plane.speeds = 1;
  CHECK_THROWS_WITH(estimator_map(s, 1, options), Catch::Contains("2 to 2000"));
  options.plane = {0.1, 0.1, 3, 3};
  options.blind_below_Hz = 0.0;
  CHECK_THROWS_WITH(estimator_map(s, 1, options), Catch::Contains("blind_below_Hz"));
  options.blind_below_Hz = 0.5;
  int told = 0;
  const EstimatorMap stopped = estimator_map(s, 1, options, [&](double) { return ++told < 2; });
  CHECK(stopped.points.size() == 6);
}
