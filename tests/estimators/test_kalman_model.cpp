// The filter's model: hand-written Jacobian against automatic differentiation, the sandwich product against
// dense matrices, the sensors' noise against its own mixing, the series against the matrix exponential.
#include <Eigen/Dense>
#include <catch2/catch.hpp>
#include <random>
#include <unsupported/Eigen/MatrixFunctions>

#include "estimators/extended_kalman.hpp"
#include "plant/math/dual.hpp"
#include "tests/estimators/machines.hpp"

using namespace slipbench;
using namespace slipbench::tests;

namespace {

using Matrix6 = Eigen::Matrix<double, 6, 6>;

Matrix6 dense(const KalmanJacobian<double>& F) {
  Matrix6 out = Matrix6::Zero();
  for (int r = 0; r < 4; ++r) {
    for (int c = 0; c < 5; ++c) out(r, c) = F.electrical[std::size_t(r)][std::size_t(c)];
  }
  for (int c = 0; c < 6; ++c) out(4, c) = F.speed[std::size_t(c)];
  out(5, 5) = 1.0;
  return out;
}
Matrix6 dense(const Symmetric6<double>& P) {
  Matrix6 out;
  for (std::size_t r = 0; r < 6; ++r) {
    for (std::size_t c = 0; c < 6; ++c) out(Eigen::Index(r), Eigen::Index(c)) = P(r, c);
  }
  return out;
}

}  // namespace

TEST_CASE("extended_kalman: hand-written Jacobian equals automatic differentiation", "[estimators][kalman]") {
  using D = Dual<double, 6>;
  std::mt19937_64 random(5);
  std::uniform_real_distribution<double> any(-1.0, 1.0);
  for (const PublishedMachine& machine : published_machines()) {
    for (const double shaft : {0.0, 1.0}) {
      EstimatorSetup setup = setup_of(machine);
      setup.viscous_friction_Nms = 0.01;
      Settings given;
      given.set("load_torque", shaft);
      const auto model = ExtendedKalman::prepare(setup, given).model;
      const auto dual_model = in_number<KalmanModel<D>, D>(model);
      for (int draw = 0; draw < 50; ++draw) {
        const KalmanVector<double> x{{20.0 * any(random), 20.0 * any(random)},
                                     {any(random), any(random)},
                                     600.0 * any(random),
                                     20.0 * any(random)};
        const Vec2<double> u{300.0 * any(random), 300.0 * any(random)};
        auto dual = in_number<KalmanVector<D>, D>(x);
        std::size_t index = 0;
        each_number(dual, [&](D& number) { number = D::variable(number.value, index++); });
        const auto next = predict_with_jacobian(dual_model, dual, Vec2<D>{D(u.x), D(u.y)});
        const Matrix6 hand = dense(predict_with_jacobian(model, x, u).F);
        Eigen::Index row = 0;
        each_number(next.x, [&](const D& number) {
          for (Eigen::Index c = 0; c < 6; ++c) {
            // Same polynomial, other order of sums: a few roundings of the row's largest entry.
            CHECK(hand(row, c) ==
                  Approx(number.slope[std::size_t(c)]).margin(1e-14 * (1.0 + hand.row(row).cwiseAbs().maxCoeff())));
          }
          ++row;
        });
      }
    }
  }
}

TEST_CASE("extended_kalman: covariance prediction equals the dense product", "[estimators][kalman]") {
  const auto model = ExtendedKalman::prepare(setup_of(barut_3kW()), {}).model;
  const auto F =
      predict_with_jacobian(model, KalmanVector<double>{{5.0, -3.0}, {0.8, 0.1}, 290.0, 5.0}, {100.0, 250.0}).F;
  const Matrix6 root = Matrix6::Random(), full = root * root.transpose();
  Symmetric6<double> P;
  for (std::size_t r = 0; r < 6; ++r) {
    for (std::size_t c = r; c < 6; ++c) P.set(r, c, full(Eigen::Index(r), Eigen::Index(c)));
  }
  const Matrix6 wanted = dense(F) * full * dense(F).transpose();
  CHECK((dense(sandwich(F, P, true)) - wanted).cwiseAbs().maxCoeff() <
        1e-13 * wanted.cwiseAbs().maxCoeff());  // rounding
}

// Exact solution: exponential of the complex 2 x 2, by Eigen's own (Pade) matrix functions, with constant
// voltage.
TEST_CASE("believed machine: a period's series agrees with the matrix exponential", "[estimators][closed_form]") {
  using C = std::complex<double>;
  for (const PublishedMachine& machine : published_machines()) {
    const BelievedMachine<double> m = believe(setup_of(machine));
    const double w_r = 1.5 * machine.plate.angular_frequency();
    Eigen::Matrix3cd A = Eigen::Matrix3cd::Zero();  // third row: the held voltage
    const C e(m.alpha, -w_r);
    A(0, 0) = -(m.R_s + m.R_R) * m.per_L_sigma;
    A(0, 1) = e * m.per_L_sigma;
    A(0, 2) = m.per_L_sigma;
    A(1, 0) = m.R_R;
    A(1, 1) = -e;
    const Eigen::Vector3cd x{C(5.0, -8.0), C(0.4, 0.6), C(-150.0, 200.0)}, exact = (m.period * A).exp() * x;
    const auto next = ahead(m, {{5.0, -8.0}, {0.4, 0.6}}, {-150.0, 200.0}, w_r).state;
    // The first term left out is (|A| T)^4 / 24 of the state; |A| T < 0.2 with all entries in play: 1e-4 of 1
    // A at most for current, whose row is 1 / L_sigma larger, and (w T)^4 / 24 = 4e-7 of 1 Wb, twice over,
    // for flux.
    CHECK(std::abs(exact(0) - C(next.current.x, next.current.y)) < 5e-4);
    CHECK(std::abs(exact(1) - C(next.flux.x, next.flux.y)) < 2e-6);
  }
}

TEST_CASE("extended_kalman: measurement noise of three and of two current sensors", "[estimators][kalman]") {
  EstimatorSetup setup = setup_of(krause_3hp());
  setup.current_noise_A = 0.2;
  // Closed form: alpha-beta as linear maps of independent phase errors of variance s^2.
  const auto three = ExtendedKalman::prepare(setup, {});
  CHECK(three.noise_diagonal.x == Approx(0.04 * 2.0 / 3.0));
  CHECK(three.noise_diagonal.y == Approx(0.04 * 2.0 / 3.0));
  CHECK(three.noise_cross == 0.0);
  setup.current_sensors = 2;
  const auto two = ExtendedKalman::prepare(setup, {});
  CHECK(two.noise_diagonal.x == Approx(0.04));
  CHECK(two.noise_diagonal.y == Approx(0.04 * (1.0 + 4.0) / 3.0));
  CHECK(two.noise_cross == Approx(0.04 / std::sqrt(3.0)));
}

TEST_CASE("extended_kalman: every default can be overridden", "[estimators][kalman]") {
  const EstimatorSetup setup = setup_of(krause_3hp());
  const auto numbers = [](const ExtendedKalman::Constants<double>& c) {
    std::vector<double> all;
    each_number(c, [&](const double& x) { all.push_back(x); });
    return all;
  };
  Settings shaft;
  shaft.set("load_torque", 1.0);
  const auto base = numbers(ExtendedKalman::prepare(setup, shaft));
  for (const Setting& setting : ExtendedKalman::settings) {
    Settings given = shaft;
    given.set(std::string(setting.name), setting.name == "load_torque" ? 0.0 : 0.123);
    INFO(setting.name);
    CHECK(numbers(ExtendedKalman::prepare(setup, given)) != base);
  }
}
