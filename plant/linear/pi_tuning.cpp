#include "plant/linear/pi_tuning.hpp"

#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

void check(double gain, double large, double small) {
  if (gain == 0.0 || !(std::abs(gain) < 1e300))
    throw LinearError("the plant's gain must be a finite number other than 0");
  if (!(large > 0.0) || !(small > 0.0) || !(large < 1e300) || !(small < 1e300))
    throw LinearError("the plant's time constants must be above 0 s");
}

}  // namespace

PiTuning magnitude_optimum(double plant_gain, double large_lag_s, double small_lags_s) {
  check(plant_gain, large_lag_s, small_lags_s);
  const double e = small_lags_s;
  PiTuning t;
  t.gain = large_lag_s / (2.0 * plant_gain * e);
  t.integral_time_s = large_lag_s;
  // |1 / (2 e s (1 + e s))| = 1 at (e w)^2 = (sqrt 2 - 1) / 2.
  const double x = slipbench::sqrt(0.5 * (slipbench::sqrt(2.0) - 1.0));
  t.crossover_rad_s = x / e;
  t.phase_margin_rad = slipbench::atan2(1.0, x);
  t.poles = {Complex(-0.5, 0.5) / e, Complex(-0.5, -0.5) / e};
  return t;
}

PiTuning symmetric_optimum(double plant_gain, double integration_s, double small_lags_s, double a) {
  check(plant_gain, integration_s, small_lags_s);
  if (!(a > 1.0) || !(a < 1e100)) throw LinearError("the symmetric optimum's a must be above 1 (2 is the classic)");
  const double e = small_lags_s;
  PiTuning t;
  t.gain = integration_s / (a * plant_gain * e);
  t.integral_time_s = a * a * e;
  t.crossover_rad_s = 1.0 / (a * e);
  t.phase_margin_rad = slipbench::atan2(a * a - 1.0, 2.0 * a);
  t.prefilter_s = t.integral_time_s;
  // a^2 (e s)^2 + a (a - 1) e s + 1 = 0, and e s = -1 / a.
  const double half = 0.5 * (a - 1.0), inside = half * half - 1.0, root = slipbench::sqrt(std::abs(inside));
  t.poles = {Complex(-1.0 / (a * e))};
  for (const double sign : {1.0, -1.0})
    t.poles.push_back(inside < 0.0 ? Complex(-half, sign * root) / (a * e) : Complex((-half + sign * root) / (a * e)));
  return t;
}

System pi_loop(const System& given, double gain, double integral_time_s, double prefilter_s) {
  const auto s = checked(given);
  if (s.discrete() || s.inputs() != 1 || s.outputs() != 1)
    throw LinearError("a PI loop is closed round a continuous plant of one input and one output");
  if (!(integral_time_s > 0.0)) throw LinearError("the integral time must be above 0 s");
  if (!(prefilter_s >= 0.0)) throw LinearError("the prefilter's lag must be 0 s or above");
  const double around = 1.0 + gain * s.D(0, 0);
  if (std::abs(around) < 1e-12) throw LinearError("1 + k D is zero: the loop through D has no solution");
  const auto n = s.order(), filter = Eigen::Index{prefilter_s > 0.0 ? 1 : 0}, size = n + 1 + filter;
  // u = row x_all + direct r; the reference inside the loop is the filter's state, if there is one.
  Matrix row = Matrix::Zero(1, size);
  row.leftCols(n) = -gain / around * s.C;
  row(0, n) = gain / (integral_time_s * around);
  if (filter) row(0, n + 1) = gain / around;
  const double direct = filter ? 0.0 : gain / around;
  System loop;
  loop.A = Matrix::Zero(size, size);
  loop.A.topLeftCorner(n, n) = s.A;
  loop.A.topRows(n) += s.B * row;
  loop.C = Matrix::Zero(2, size);
  loop.C.topLeftCorner(1, n) = s.C;
  loop.C.topRows(1) += s.D * row;
  loop.C.bottomRows(1) = row;
  loop.B = Matrix::Zero(size, 1);
  loop.B.topRows(n) = s.B * direct;
  loop.D.resize(2, 1);
  loop.D << s.D(0, 0) * direct, direct;
  loop.A.row(n) = -loop.C.row(0);
  loop.B(n, 0) = -loop.D(0, 0);
  if (filter) {
    loop.A(n, n + 1) += 1.0;
    loop.A(n + 1, n + 1) = -1.0 / prefilter_s;
    loop.B(n + 1, 0) = 1.0 / prefilter_s;
  } else {
    loop.B(n, 0) += 1.0;
  }
  for (Eigen::Index i = 0; i < n; ++i) loop.state_names.push_back(s.state_name(i));
  loop.state_names.push_back("integral of the error");
  if (filter) loop.state_names.push_back("filtered reference");
  loop.input_names = {"reference of " + s.output_name(0)};
  loop.output_names = {s.output_name(0), s.input_name(0)};
  return loop;
}

}  // namespace slipbench::linear
