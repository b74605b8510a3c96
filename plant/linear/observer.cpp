#include "plant/linear/observer.hpp"

#include "plant/linear/dense.hpp"
#include "plant/linear/lyapunov.hpp"
#include "plant/linear/place.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

constexpr double pi = 0x1.921fb54442d18p+1;

void expect_shape(const char* name, const Matrix& m, Eigen::Index rows, Eigen::Index columns) {
  if (m.rows() == rows && m.cols() == columns) return;
  throw LinearError(std::string(name) + " is " + std::to_string(m.rows()) + " x " + std::to_string(m.cols()) +
                    ", but must be " + std::to_string(rows) + " x " + std::to_string(columns));
}

Complex faster(Complex pole, double factor, bool discrete) {
  if (!discrete) return factor * pole;
  const double size = magnitude(pole);
  if (size == 0.0) return 0.0;
  const double shrunk = slipbench::exp(factor * slipbench::log(size));
  if (pole.imag() == 0.0) return pole.real() < 0.0 ? -shrunk : shrunk;
  const double angle = slipbench::atan2(pole.imag(), pole.real()), turned = factor * angle;
  return shrunk * unit_at(std::abs(turned) < pi ? turned : angle);
}

double slowest(const System& s, const std::vector<Complex>& poles) {
  double time = 0.0;
  for (const auto p : poles) {
    const double size = magnitude(p);
    if (s.discrete() && size == 0.0) continue;  // dead beat
    time = std::max(time, s.discrete() ? -s.sample_period_s / slipbench::log(size) : -1.0 / p.real());
  }
  return time;
}

}  // namespace

Observer observer_by_poles(const System& given, const std::vector<Complex>& poles) {
  const auto s = checked(given);
  const auto dual = place(s.A.transpose(), s.C.transpose(), poles, "unobservable");
  Observer o;
  o.L = dual.K.transpose();
  o.poles = dual.poles;
  o.condition = dual.condition;
  o.residual = dual.residual;
  o.warning = dual.warning;
  return o;
}

std::vector<Complex> faster_poles(const System& given, const Matrix& K, double factor) {
  const auto s = checked(given);
  expect_shape("K", K, s.inputs(), s.order());
  if (!(factor > 0.0)) throw LinearError("an observer's factor must be above 0 (2 to 5 is common practice)");
  auto poles = eigenvalues(s.A - s.B * K);
  for (auto& p : poles) p = faster(p, factor, s.discrete());
  return poles;
}

Observer observer_faster_than(const System& system, const Matrix& K, double factor) {
  return observer_by_poles(system, faster_poles(system, K, factor));
}

Matrix noise_covariance(const System& given, const Matrix& L, const Matrix& V) {
  const auto s = checked(given);
  expect_shape("L", L, s.order(), s.outputs());
  const Matrix noise = V.size() == 0 ? Matrix(Matrix::Identity(s.outputs(), s.outputs())) : V;
  expect_shape("V", noise, s.outputs(), s.outputs());
  const Matrix error = s.A - L * s.C, drive = L * noise * L.transpose();
  for (const auto p : eigenvalues(error))
    if (!(s.discrete() ? magnitude(p) < 1.0 : p.real() < 0.0))
      throw LinearError("the observer's error does not decay: it has a pole at " + text_of(p));
  const Matrix P = s.discrete() ? stein(error, drive) : lyapunov(error, drive);
  return 0.5 * (P + P.transpose());
}

std::vector<FactorCost> sweep_factor(const System& system, const Matrix& K, const std::vector<double>& factors,
                                     const Matrix& V) {
  std::vector<FactorCost> rows;
  for (const double factor : factors) {
    FactorCost row;
    row.factor = factor;
    row.observer = observer_faster_than(system, K, factor);
    row.rms = noise_covariance(system, row.observer.L, V).diagonal().cwiseMax(0.0).cwiseSqrt();
    row.slowest_s = slowest(system, row.observer.poles);
    rows.push_back(row);
  }
  return rows;
}

}  // namespace slipbench::linear
