#include "plant/linear/current_loop.hpp"

#include <Eigen/LU>

#include "plant/linear/discretise.hpp"
#include "plant/linear/exponential.hpp"
#include "plant/linear/kalman.hpp"
#include "plant/linear/lqr.hpp"
#include "plant/linear/reference_gain.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

using Eigen::Index;

// a + j b as the matrix that multiplies a vector by it.
Matrix turning(double a, double b) {
  Matrix m(2, 2);
  m << a, 0.0 - b, b, a;  // no negative zero
  return m;
}

Matrix zero_across(Matrix gains) {
  for (Index row = 0; row < gains.rows(); ++row) {
    for (Index column = 0; column < gains.cols(); ++column) {
      if ((row + column) % 2 != 0) gains(row, column) = 0.0;
    }
  }
  return gains;
}

System in_rotor_frame(const Circuit<double>& circuit, double w) {
  System s = machine_at_speed(circuit, w);
  s.A.topLeftCorner(2, 2) -= turning(0.0, w);
  s.A.bottomRightCorner(2, 2) -= turning(0.0, w);
  s.A(3, 1) = 0.0;
  return s;
}

}  // namespace

System machine_at_speed(const Circuit<double>& circuit, double w) {
  const InverseGamma<double> c = to_inverse_gamma(circuit);
  const double R = c.stator_resistance + c.rotor_resistance;
  const double rate = circuit.rotor_resistance / circuit.rotor_inductance();
  System s;
  s.A = Matrix::Zero(4, 4);
  s.A.topLeftCorner(2, 2) = turning(-R / c.leakage, 0.0);
  s.A.topRightCorner(2, 2) = turning(c.flux_ratio * rate / c.leakage, -c.flux_ratio * w / c.leakage);
  s.A.bottomLeftCorner(2, 2) = turning(circuit.magnetizing_inductance * rate, 0.0);
  s.A.bottomRightCorner(2, 2) = turning(-rate, w);
  s.B = Matrix::Zero(4, 2);
  s.B.topRows(2) = turning(1.0 / c.leakage, 0.0);
  s.C = Matrix::Identity(2, 4);
  s.D = Matrix::Zero(2, 2);
  s.state_names = {"i_alpha", "i_beta", "psi_alpha", "psi_beta"};
  s.input_names = {"u_alpha", "u_beta"};
  s.output_names = {"i_alpha", "i_beta"};
  return s;
}

System current_loop(const CurrentLoopDesign& design, double w) {
  const System machine = in_rotor_frame(design.circuit, w);
  const double T = design.period_s;
  // The held voltage is a state that turns backwards in the frame.
  Matrix with_voltage = Matrix::Zero(6, 6);
  with_voltage.topLeftCorner(4, 4) = machine.A;
  with_voltage.topRightCorner(4, 2) = machine.B;
  with_voltage.bottomRightCorner(2, 2) = turning(0.0, -w);
  const Matrix ahead = exponential(with_voltage * T);
  const SinCos<double> half = sincos(0.5 * w * T);
  const Matrix from_voltage = ahead.topRightCorner(4, 2) * turning(half.cos, half.sin);

  const Index d = design.delay_periods, n = 4 + 2 * d;
  System s;
  s.sample_period_s = T;
  s.A = Matrix::Zero(n, n);
  s.B = Matrix::Zero(n, 2);
  s.A.topLeftCorner(4, 4) = ahead.topLeftCorner(4, 4);
  if (d == 0) {
    s.B = from_voltage;
  } else {
    s.A.block(0, n - 2, 4, 2) = from_voltage;
    s.B.block(4, 0, 2, 2) = Matrix::Identity(2, 2);
  }
  if (d == 2) s.A.block(6, 4, 2, 2) = Matrix::Identity(2, 2);
  s.C = Matrix::Identity(2, n);
  s.D = Matrix::Zero(2, 2);
  s.state_names = {"i_d", "i_q", "psi_d", "psi_q"};
  for (Index back = 1; back <= d; ++back) {
    for (const char* axis : {"d", "q"})
      s.state_names.push_back("u_" + std::string(axis) + "(k-" + std::to_string(back) + ")");
  }
  s.input_names = {"u_d", "u_q"};
  s.output_names = {"i_d", "i_q"};
  return s;
}

CurrentLoopGains current_loop_gains(const CurrentLoopDesign& design, double w) {
  const System plant = current_loop(design, w);
  const Index n = plant.order();
  const double weight = 1.0 / square(design.bandwidth * to_inverse_gamma(design.circuit).leakage);
  const Matrix R = weight * Matrix::Identity(2, 2);
  const bool integral = design.integral_bandwidth > 0.0;
  Matrix Q = Matrix::Zero(integral ? n + 2 : n, integral ? n + 2 : n);
  Q.topLeftCorner(2, 2) = Matrix::Identity(2, 2);
  if (integral) Q.bottomRightCorner(2, 2) = square(design.integral_bandwidth) * Matrix::Identity(2, 2);

  // Voltage that keeps the flux from moving the current, u = E x + v: the weight is on v.
  const Matrix by_voltage = design.delay_periods == 0 ? plant.B.topRows(2) : plant.A.block(0, n - 2, 2, 2);
  Matrix E = Matrix::Zero(2, n);
  E.middleCols(2, 2) = -by_voltage.partialPivLu().solve(plant.A.block(0, 2, 2, 2));
  System weighed = plant;
  weighed.A += plant.B * E;

  const StateFeedback found = integral ? lqr_with_integral(weighed, Q, R) : lqr(weighed, Q, R);
  CurrentLoopGains gains;
  gains.K = found.K.leftCols(n) - E;
  gains.poles = found.poles;
  gains.residual = found.residual, gains.condition = found.condition, gains.warning = found.warning;
  const ReferenceGain reference = reference_gain(plant, gains.K);
  gains.N = reference.N;
  if (integral) {
    gains.K_integral = -plant.sample_period_s * found.K.rightCols(2);
    // The error summed on the way to a step, flux and its voltage already there: C (I - F + G K)^-1 X.
    Matrix missing = reference.state;
    for (Index from = 4; from < n; from += 2)
      missing.middleRows(from, 2) -= E.middleCols(2, 2) * reference.state.middleRows(2, 2);
    missing.middleRows(2, 2).setZero();
    const Matrix closed = Matrix::Identity(n, n) - (plant.A - plant.B * gains.K);
    gains.N -= gains.K_integral * (plant.C * closed.partialPivLu().solve(missing));
  }
  if (w == 0.0) {
    gains.K = zero_across(gains.K), gains.N = zero_across(gains.N);
    gains.K_integral = zero_across(gains.K_integral);
  }
  return gains;
}

Matrix stationary_observer(const Circuit<double>& circuit, double period_s, double w, const ObserverNoise& noise) {
  const System plant = discretise(machine_at_speed(circuit, w), period_s, Discretisation::zero_order_hold);
  Matrix W = square(noise.voltage_V) * plant.B * plant.B.transpose();
  W.bottomRightCorner(2, 2) += square(noise.flux_Wb) * Matrix::Identity(2, 2);
  const Matrix V = square(noise.current_A) * Matrix::Identity(2, 2);
  const Matrix M = stationary_kalman(plant, W, V).M;
  // The filter of a machine that looks the same from all sides does so too; rounding is taken out.
  constexpr double rounding = 1e-14;
  Matrix round(4, 2);
  for (Index row = 0; row < 4; row += 2) {
    const double a = 0.5 * (M(row, 0) + M(row + 1, 1)), b = 0.5 * (M(row + 1, 0) - M(row, 1));
    round.middleRows(row, 2) = turning(a, fabs(b) > rounding * fabs(a) ? b : 0.0);
  }
  return w == 0.0 ? zero_across(round) : round;
}

Matrix faster_observer(const Circuit<double>& circuit, double period_s, double w, double bandwidth, double factor) {
  const Matrix ahead = exponential(machine_at_speed(circuit, w).A * period_s);
  const auto entry = [&](Index row, Index column) {
    return Complex(ahead(2 * row, 2 * column), ahead(2 * row + 1, 2 * column));
  };
  const Complex a = entry(0, 0), b = entry(0, 1), c = entry(1, 0), d = entry(1, 1);
  const double rate = circuit.rotor_resistance / circuit.rotor_inductance();
  const SinCos<double> turned = sincos(w * period_s);
  const Complex fast = exp(-factor * bandwidth * period_s);
  const Complex slow = exp(-factor * rate * period_s) * Complex(turned.cos, turned.sin);
  // One complex output, two complex states: trace and determinant of (I - M C) e^(A T) are those of the wished poles.
  const Complex first = 1.0 - fast * slow / (a * d - b * c);
  const Complex second = ((1.0 - first) * a + d - fast - slow) / b;
  Matrix M(4, 2);
  M.topRows(2) = turning(first.real(), first.imag());
  M.bottomRows(2) = turning(second.real(), second.imag());
  return w == 0.0 ? zero_across(M) : M;
}

}  // namespace slipbench::linear
