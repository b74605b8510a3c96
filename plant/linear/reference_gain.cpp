#include "plant/linear/reference_gain.hpp"

#include <Eigen/Dense>
#include <algorithm>
#include <cstdio>

#include "plant/linear/dense.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

constexpr double unit = 0x1p-52;

std::string short_text(double value) {
  char text[32];
  std::snprintf(text, sizeof text, "%.2g", value);
  return text;
}

double power_of_two_near(double size) { return size > 0.0 ? two_to_the(exponent_of(size)) : 1.0; }

// diag(row) M diag(column) has rows and columns of like size, whatever the units.
struct Scaled {
  Matrix M;
  Vector row, column;
};

Scaled equilibrated(Matrix m) {
  Scaled s{m, Vector::Ones(m.rows()), Vector::Ones(m.cols())};
  for (int pass = 0; pass < 3; ++pass) {
    for (Eigen::Index i = 0; i < m.rows(); ++i) {
      const double f = 1.0 / power_of_two_near(s.M.row(i).norm());
      s.M.row(i) *= f, s.row(i) *= f;
    }
    for (Eigen::Index j = 0; j < m.cols(); ++j) {
      const double f = 1.0 / power_of_two_near(s.M.col(j).norm());
      s.M.col(j) *= f, s.column(j) *= f;
    }
  }
  return s;
}

// M^-1 right by the equilibrated M.
Matrix solved(const Scaled& s, const Matrix& right) {
  if (s.M.size() == 0) return Matrix::Zero(s.M.cols(), right.cols());
  return s.column.asDiagonal() * Matrix(s.M.fullPivLu().solve(Matrix(s.row.asDiagonal() * right)));
}

// [A B; C D], discrete A - I.
Matrix steady(const System& s) {
  const auto n = s.order(), m = s.inputs(), p = s.outputs();
  Matrix M(n + p, n + m);
  M << (s.discrete() ? Matrix(s.A - Matrix::Identity(n, n)) : s.A), s.B, s.C, s.D;
  return M;
}

double spread(const Matrix& m) {
  const auto values = singular_values(m);
  if (values.size() == 0) return 1.0;
  return values.minCoeff() > 0.0 ? values.maxCoeff() / values.minCoeff() : 1e300;
}

}  // namespace

void refuse_unsteerable(const System& given, const std::string& purpose) {
  const auto s = checked(given);
  if (s.outputs() > s.inputs())
    throw LinearError(purpose + " can't be had: " + std::to_string(s.outputs()) +
                      " outputs can't follow their references with " + std::to_string(s.inputs()) +
                      (s.inputs() == 1 ? " input" : " inputs"));
  if (spread(equilibrated(steady(s)).M) < 1.0 / trusted_digits) return;
  throw LinearError(
      purpose + " can't be had: the plant has a zero at " + (s.discrete() ? "z = 1" : "s = 0") +
      " (or a mode there that the inputs don't move), so that no steady input holds every output at its reference");
}

ReferenceGain reference_gain(const System& given, const Matrix& K) {
  const auto s = checked(given);
  const auto n = s.order(), m = s.inputs(), p = s.outputs();
  if (K.rows() != m || K.cols() != n)
    throw LinearError("K is " + std::to_string(K.rows()) + " x " + std::to_string(K.cols()) + ", but must be " +
                      std::to_string(m) + " x " + std::to_string(n));
  if (m != p)
    throw LinearError("a reference gain needs as many inputs as outputs, but there are " + std::to_string(m) + " and " +
                      std::to_string(p) + ": choose which outputs shall follow");
  refuse_unsteerable(s, "a reference gain");

  ReferenceGain g;
  const auto direct = equilibrated(steady(s));
  Matrix wish = Matrix::Zero(n + p, p);
  wish.bottomRows(p).setIdentity();
  const Matrix both = solved(direct, wish);
  g.state = both.topRows(n);
  g.input = both.bottomRows(m);
  g.N = g.input + K * g.state;

  const Matrix closed = s.A - s.B * K;
  const auto inner = equilibrated(s.discrete() ? Matrix(closed - Matrix::Identity(n, n)) : closed);
  g.condition = std::max(spread(direct.M), spread(inner.M));
  if (spread(inner.M) > 1.0 / trusted_digits)
    throw LinearError(std::string("a reference gain can't be had: the closed loop has a pole at ") +
                      (s.discrete() ? "z = 1" : "s = 0"));
  const Matrix moved = solved(inner, s.B);
  const Matrix dc = s.D - (s.C - s.D * K) * moved;
  const auto outer = equilibrated(dc);
  g.condition = std::max(g.condition, spread(outer.M) * spread(inner.M));
  g.N_from_dc_gain = solved(outer, Matrix::Identity(p, p));
  const double size = std::max(g.N.norm(), (K * g.state).norm());
  g.difference = size > 0.0 ? (g.N - g.N_from_dc_gain).norm() / size : 0.0;
  if (g.difference > 100.0 * unit * g.condition)
    g.warning =
        "the two ways to the reference gain differ by " + short_text(g.difference) + " relative: do not trust it";
  else if (g.condition * unit > 1e-6)
    g.warning = "ill-conditioned: the reference gain may be wrong by " + short_text(g.condition * unit) + " relative";
  return g;
}

}  // namespace slipbench::linear
