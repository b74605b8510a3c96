#include "plant/linear/response.hpp"

#include "plant/linear/dense.hpp"
#include "plant/linear/exponential.hpp"

namespace slipbench::linear {
namespace {

using Index = Eigen::Index;

double checked_step(const System& s, double step_s, Index steps) {
  if (steps < 0) throw LinearError("a response takes 0 steps or more");
  if (s.discrete()) {
    if (step_s != 0.0 && std::abs(step_s - s.sample_period_s) > 1e-9 * s.sample_period_s)
      throw LinearError("a discrete system answers at its own period of " + std::to_string(s.sample_period_s) + " s");
    return s.sample_period_s;
  }
  if (!(step_s > 0.0) || !(step_s < 1e300)) throw LinearError("the spacing of a response must be above 0 s");
  return step_s;
}

Vector initial(const System& s, const Vector& x0) {
  if (x0.size() == 0) return Vector::Zero(s.order());
  if (x0.size() != s.order())
    throw LinearError("the initial state has " + std::to_string(x0.size()) + " numbers, but the system " +
                      std::to_string(s.order()) + " states");
  return x0;
}

Response empty(const System& s, double step_s, Index steps) {
  Response r;
  r.sampled = s.discrete();
  r.time_s.resize(static_cast<std::size_t>(steps) + 1);
  for (Index k = 0; k <= steps; ++k) r.time_s[static_cast<std::size_t>(k)] = static_cast<double>(k) * step_s;
  r.y.resize(steps + 1, s.outputs());
  r.u = Matrix::Zero(steps + 1, s.inputs());
  r.x.resize(steps + 1, s.order());
  return r;
}

void expect_input(const System& s, Index input) {
  if (input < 0 || input >= s.inputs())
    throw LinearError("there is no input " + std::to_string(input + 1) + ": the system has " +
                      std::to_string(s.inputs()));
}

struct Step {
  Matrix A, B;
};

// x(h) = A x + B u for u held, by one exponential of [A B; 0 0] h.
Step held(const System& s, double step_s) {
  if (s.discrete()) return {s.A, s.B};
  const auto n = s.order(), m = s.inputs();
  Matrix both = Matrix::Zero(n + m, n + m);
  both.topRows(n) << s.A * step_s, s.B * step_s;
  const Matrix e = exponential(both);
  return {e.topLeftCorner(n, n), e.topRightCorner(n, m)};
}

}  // namespace

Response response_to(const System& given, const Matrix& inputs, double step_s, const Vector& x0) {
  const auto s = checked(given);
  if (inputs.rows() == 0 || inputs.cols() != s.inputs())
    throw LinearError("the input record has " + std::to_string(inputs.cols()) + " columns and " +
                      std::to_string(inputs.rows()) + " rows, but needs one column for each of " +
                      std::to_string(s.inputs()) + " inputs and a row an instant");
  const auto steps = inputs.rows() - 1;
  const double h = checked_step(s, step_s, steps);
  auto r = empty(s, h, steps);
  r.u = inputs;
  const auto step = held(s, h);
  Vector x = initial(s, x0);
  for (Index k = 0; k <= steps; ++k) {
    const Vector u = inputs.row(k).transpose();
    r.x.row(k) = x.transpose();
    r.y.row(k) = (s.C * x + s.D * u).transpose();
    x = (step.A * x + step.B * u).eval();
  }
  return r;
}

Response step_response(const System& given, Index input, double step_s, Index steps, double amplitude,
                       const Vector& x0) {
  const auto s = checked(given);
  expect_input(s, input);
  checked_step(s, step_s, steps);
  Matrix u = Matrix::Zero(steps + 1, s.inputs());
  u.col(input).setConstant(amplitude);
  return response_to(s, u, step_s, x0);
}

Response sine_response(const System& given, Index input, double frequency_rad_s, double step_s, Index steps,
                       double amplitude, const Vector& x0) {
  const auto s = checked(given);
  expect_input(s, input);
  const double h = checked_step(s, step_s, steps);
  if (!(frequency_rad_s >= 0.0) || !(frequency_rad_s < 1e300))
    throw LinearError("a frequency must be 0 rad/s or above");
  auto r = empty(s, h, steps);
  const auto n = s.order();
  // States [x; w1; w2], u = w1 = amplitude sin(f t).
  Matrix both = Matrix::Zero(n + 2, n + 2);
  both.topLeftCorner(n, n) = s.A;
  both.block(0, n, n, 1) = s.B.col(input);
  if (s.discrete()) {
    const Complex turn = unit_at(frequency_rad_s * h);
    both.bottomRightCorner(2, 2) << turn.real(), turn.imag(), -turn.imag(), turn.real();
  } else {
    both.bottomRightCorner(2, 2) << 0.0, frequency_rad_s, -frequency_rad_s, 0.0;
    both = exponential(both * h);
  }
  Vector z = Vector::Zero(n + 2);
  z.head(n) = initial(s, x0);
  z(n + 1) = amplitude;
  for (Index k = 0; k <= steps; ++k) {
    // The oscillator afresh from its phase, or its rounding would grow with the number of steps.
    const Complex now = unit_at(frequency_rad_s * r.time_s[static_cast<std::size_t>(k)]);
    z(n) = amplitude * now.imag();
    z(n + 1) = amplitude * now.real();
    r.u(k, input) = z(n);
    r.x.row(k) = z.head(n).transpose();
    r.y.row(k) = (s.C * z.head(n) + s.D.col(input) * z(n)).transpose();
    z = (both * z).eval();
  }
  return r;
}

}  // namespace slipbench::linear
