// Model and gains of the current loop and its observer, against SciPy, closed forms and the machine's own equations.
#include <Eigen/Eigenvalues>
#include <catch2/catch.hpp>
#include <cmath>

#include "plant/current_flux_observer.hpp"
#include "plant/linear/current_loop.hpp"
#include "plant/linear/exponential.hpp"
#include "plant/machine.hpp"
#include "tests/published/circuits.hpp"

using namespace slipbench;
using namespace slipbench::linear;

namespace {

constexpr double two_pi = 6.28318530717958647692;
const std::array circuits{published::krause_3hp_circuit().circuit, published::barut_3kw_circuit().circuit,
                          published::hinkkanen_2kw_circuit().circuit, published::krishnan_5hp_circuit().circuit};

std::vector<Complex> eigenvalues(const Matrix& A) {
  const Eigen::VectorXcd all = A.eigenvalues();
  return {all.begin(), all.end()};
}
double nearest(const std::vector<Complex>& all, Complex wanted) {
  double best = 1e300;
  for (const Complex& z : all) best = std::min(best, std::abs(z - wanted));
  return best;
}

}  // namespace

// The rates of plant/machine.hpp (flux linkages, T circuit) at random currents, fluxes and voltages; rounding.
TEST_CASE("machine at constant speed: rates are the machine's", "[linear][closed_form]") {
  for (const Circuit<double>& c : circuits) {
    const Machine<double> m = make_machine(c);
    const System s = machine_at_speed(c, 187.0);
    const MachineFlux<double> psi{{0.71, -0.33}, {0.52, 0.48}};
    const Vec2<double> u{113.0, -71.0}, i = stator_current(m, psi);
    const MachineFlux<double> rate = flux_derivative(m, psi, i, u, 187.0);
    const Vec2<double> current_rate = stator_current(m, rate);
    Vector x(4), v(2), expected(4);
    x << i.x, i.y, psi.rotor.x, psi.rotor.y;
    v << u.x, u.y;
    expected << current_rate.x, current_rate.y, rate.rotor.x, rate.rotor.y;
    CHECK((s.A * x + s.B * v - expected).norm() < 1e-10 * expected.norm());
    const CurrentFlux<double> again = unforced(current_flux_model(c, 1e-4), {i, psi.rotor}, 187.0);
    CHECK(again.flux.x == Approx(rate.rotor.x).epsilon(1e-10));
    CHECK(again.current.y == Approx(current_rate.y - u.y * m.per_Ls).epsilon(1e-10));
  }
}

// Series to the sixth power against the exponential: (|A| T)^7 / 5040 of the state with |A| below 700 1/s at 90 Hz, 1e-12.
TEST_CASE("observer's prediction: a period ahead is the exponential's", "[linear][closed_form]") {
  for (const Circuit<double>& c : circuits) {
    for (const double w : {0.0, -150.0, 560.0}) {
      const System s = machine_at_speed(c, w);
      Matrix held = Matrix::Zero(6, 6);
      held.topRows(4) << s.A, s.B;
      const Matrix ahead = exponential(held * 1e-4);
      Vector x(6);
      x << 3.0, -4.0, 0.5, 0.7, 120.0, -210.0;
      const Vector expected = ahead.topRows(4) * x;
      const CurrentFlux<double> got =
          period_ahead(current_flux_model(c, 1e-4), {{x(0), x(1)}, {x(2), x(3)}}, Vec2<double>{x(4), x(5)}, w);
      Vector found(4);
      found << got.current.x, got.current.y, got.flux.x, got.flux.y;
      CHECK((found - expected).norm() < 1e-10 * expected.norm());
    }
  }
}

// SciPy 1.10, solve_discrete_are, on a model written anew in NumPy (frame, held voltage, delay, weights as the header says):
// Hinkkanen 2.2 kW, 50 Hz, T = 100 us, 300 Hz; without delay and integral, and with one period and 60 Hz. Both solvers are good
// to some 1e-12 times the equation's condition, below 1e4 here.
TEST_CASE("current loop: gains are SciPy's", "[linear][published]") {
  const Circuit<double> c = published::hinkkanen_2kw_circuit().circuit;
  const auto close = [](const Matrix& got, const Matrix& expected) {
    INFO(got << "\nexpected\n" << expected);
    REQUIRE(got.rows() == expected.rows());
    REQUIRE(got.cols() == expected.cols());
    CHECK((got - expected).norm() < 1e-8 * expected.norm());
  };
  const CurrentLoopGains plain = current_loop_gains({c, 1e-4, 0, two_pi * 300.0, 0.0}, two_pi * 50.0);
  Matrix K(2, 4), N(2, 2);
  K << 31.293195663964305, 0.48274234247520675, 6.2681937317608245, 314.04737332010774,  //
      -0.5030020096590189, 31.28935243051163, -314.04727072885487, 6.268192122232178;
  N << 36.61188433157791, -6.083270754000119, 6.0890278191129426, 36.608694383088725;
  close(plain.K, K);
  close(plain.N, N);
  CHECK(plain.K_integral.size() == 0);

  const CurrentLoopGains whole = current_loop_gains({c, 1e-4, 1, two_pi * 300.0, two_pi * 60.0}, two_pi * 50.0);
  Matrix K1(2, 6), K_I(2, 2);
  K1 << 38.810742593577935, 1.3514220291580792, 5.955544996743011, 370.94991982835666, 0.18172227867739632,
      0.004608805370252074,  //
      -1.4175387736701577, 38.79926856029343, -370.935556670269, 5.865872579273135, -0.004893332147022905,
      0.18167189402099068;
  K_I << 1.331590592736656, -0.1884973827230864, 0.188689197341251, 1.3315980792524098;
  N << 37.587414986627174, -6.101603305268981, 6.117457335722193, 37.57835307880128;
  close(whole.K, K1);
  close(whole.K_integral, K_I);
  close(whole.N, N);
}

// A machine turning the other way is its mirror image: q changes sign, so do gains across d and q.
TEST_CASE("current loop: gains at a negative speed are the mirror's", "[linear][closed_form]") {
  for (const Circuit<double>& c : circuits) {
    const CurrentLoopDesign design{c, 1e-4, 1, two_pi * 380.0, two_pi * 76.0};
    const CurrentLoopGains right = current_loop_gains(design, 200.0), left = current_loop_gains(design, -200.0);
    for (Eigen::Index row = 0; row < 2; ++row) {
      for (Eigen::Index column = 0; column < 6; ++column) {
        const double sign = (row + column) % 2 == 0 ? 1.0 : -1.0;
        CHECK(left.K(row, column) == Approx(sign * right.K(row, column)).margin(1e-9 * right.K.norm()));
      }
    }
    const CurrentLoopGains rest = current_loop_gains(design, 0.0);
    CHECK(rest.K(0, 1) == 0.0);
    CHECK(rest.K(1, 2) == 0.0);
    CHECK(rest.N(0, 1) == 0.0);
  }
}

// (I - M C) e^(A T) has the poles asked for: two conjugate pairs. The eigenvalues are as good as rounding of a matrix of norm 30.
TEST_CASE("observer: poles are those asked for", "[linear][closed_form]") {
  for (const Circuit<double>& c : circuits) {
    for (const double w : {0.0, 120.0, 400.0}) {
      const double T = 1e-4, bandwidth = two_pi * 380.0, factor = 3.0;
      const Matrix M = faster_observer(c, T, w, bandwidth, factor), ahead = exponential(machine_at_speed(c, w).A * T);
      const Matrix error = ahead - M * ahead.topRows(2);
      const std::vector<Complex> poles = eigenvalues(error);
      const double rate = c.rotor_resistance / c.rotor_inductance();
      INFO(w);
      CHECK(nearest(poles, std::exp(-factor * bandwidth * T)) < 1e-6);
      CHECK(nearest(poles, std::exp(Complex(-factor * rate, w) * T)) < 1e-6);
    }
  }
}

// Kalman's gain: the error's covariance at rest reproduces itself, P = (I - M C)(A P A' + W)(I - M C)' + M V M' found by iteration
// from the gain alone, and no gain near it does better (its trace is least, to second order).
TEST_CASE("observer: Kalman's gain is the best near it", "[linear][physics]") {
  const Circuit<double> c = published::barut_3kw_circuit().circuit;
  const double T = 1e-4, w = 250.0;
  const ObserverNoise noise{0.05, 2.0, 2e-4};
  const Matrix M = stationary_observer(c, T, w, noise);
  Matrix held = Matrix::Zero(6, 6);
  held.topRows(4) << machine_at_speed(c, w).A, machine_at_speed(c, w).B;
  const Matrix ahead = exponential(held * T), A = ahead.topLeftCorner(4, 4), B = ahead.topRightCorner(4, 2);
  Matrix W = 4.0 * B * B.transpose();
  W.bottomRightCorner(2, 2) += 4e-8 * Matrix::Identity(2, 2);
  const auto spread = [&](const Matrix& gain) {
    const Matrix keep = Matrix::Identity(4, 4) - gain * Matrix::Identity(2, 4);
    Matrix P = Matrix::Zero(4, 4);
    for (int k = 0; k < 20000; ++k)
      P = keep * (A * P * A.transpose() + W) * keep.transpose() + 0.0025 * gain * gain.transpose();
    return P(0, 0) + 1e3 * P(2, 2);
  };
  const double best = spread(M);
  for (Eigen::Index row = 0; row < 4; row += 2) {
    for (const double change : {0.9, 1.1}) {
      Matrix other = M;
      other.middleRows(row, 2) *= change;
      CHECK(spread(other) > best);
    }
  }
}
