#include "plant/linear/balance.hpp"

#include <bit>
#include <cmath>
#include <cstdint>

#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

// The power of two next to x > 0, kept far from where 2^k leaves the normal numbers.
double power_of_two_near(double x) {
  double exponent = exponent_of(x);
  if (x / two_to_the(exponent) > 1.4142135623730951) exponent += 1.0;
  return two_to_the(std::fmin(std::fmax(exponent, -500.0), 500.0));
}

// Scales so that row i of `rows` is as large as column i of `columns`; both hold every entry but A's diagonal.
// by = 1 / sqrt(2) ... : a step is taken when it lessens the sum of the two by a twentieth.
Vector scale_of(Matrix a, Matrix b, Matrix c) {
  const auto n = a.rows();
  Vector scale = Vector::Ones(n);
  bool again = true;
  for (int sweep = 0; again && sweep < 100; ++sweep) {
    again = false;
    for (Eigen::Index i = 0; i < n; ++i) {
      const double own = a(i, i);
      a(i, i) = 0.0;
      const double column = std::sqrt(a.col(i).squaredNorm() + c.col(i).squaredNorm());
      const double row = std::sqrt(a.row(i).squaredNorm() + b.row(i).squaredNorm());
      a(i, i) = own;
      if (column == 0.0 || row == 0.0) continue;
      // x_i = f z_i: row i is divided by f, column i multiplied by it.
      const double factor = power_of_two_near(std::sqrt(row / column));
      if (factor == 1.0 || column * factor + row / factor >= 0.95 * (column + row)) continue;
      scale(i) *= factor;
      a.col(i) *= factor;
      c.col(i) *= factor;
      a.row(i) /= factor;
      b.row(i) /= factor;
      again = true;
    }
  }
  return scale;
}

}  // namespace

Vector balancing_scale(const Matrix& a) { return scale_of(a, Matrix(a.rows(), 0), Matrix(0, a.rows())); }

BalancedUnits in_balanced_units(const System& given) {
  const auto n = given.order(), m = given.inputs(), p = given.outputs();
  BalancedUnits out{given, Vector::Ones(n), Vector::Ones(m), Vector::Ones(p)};
  System& s = out.system;
  // Twice: the states' units decide how large a column of B is, and B's columns how large a state is.
  for (int round = 0; round < 2; ++round) {
    const double size = s.A.norm() > 0.0 ? power_of_two_near(s.A.norm()) : 1.0;
    for (Eigen::Index j = 0; j < m; ++j)
      if (const double length = s.B.col(j).norm(); length > 0.0) {
        const double factor = power_of_two_near(size / length);
        s.B.col(j) *= factor;
        out.input(j) *= factor;
      }
    for (Eigen::Index i = 0; i < p; ++i)
      if (const double length = s.C.row(i).norm(); length > 0.0) {
        const double factor = power_of_two_near(size / length);
        s.C.row(i) *= factor;
        out.output(i) /= factor;
      }
    const Vector scale = scale_of(s.A, s.B, s.C), inverse = scale.cwiseInverse();
    s.A = inverse.asDiagonal() * s.A * scale.asDiagonal();
    s.B = inverse.asDiagonal() * s.B;
    s.C = s.C * scale.asDiagonal();
    out.state = out.state.cwiseProduct(scale);
  }
  s.D = out.output.cwiseInverse().asDiagonal() * given.D * out.input.asDiagonal();
  return out;
}

}  // namespace slipbench::linear
