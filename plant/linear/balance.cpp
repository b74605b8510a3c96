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

// Scales so that row i of [a b] is as large as column i of [a; c], a's diagonal apart. A step is taken when it lessens the sum
// of the two by a twentieth. Where one of them is zero the state's unit is free: one last sweep makes the other as large as
// a's largest diagonal entry.
Vector scale_of(Matrix a, Matrix b, Matrix c) {
  const auto n = a.rows();
  Vector scale = Vector::Ones(n);
  const double diagonal = n > 0 ? a.diagonal().cwiseAbs().maxCoeff() : 0.0;
  // Scales state i when that is worth it: x_i = f z_i, row i is divided by f, column i multiplied by it.
  const auto step = [&](Eigen::Index i, bool one_sided) {
    const double own = a(i, i);
    a(i, i) = 0.0;
    const double column = std::sqrt(a.col(i).squaredNorm() + c.col(i).squaredNorm());
    const double row = std::sqrt(a.row(i).squaredNorm() + b.row(i).squaredNorm());
    a(i, i) = own;
    double wanted = 0.0;
    if (row > 0.0 && column > 0.0)
      wanted = one_sided ? 0.0 : std::sqrt(row / column);
    else if (one_sided && row > 0.0)
      wanted = diagonal > 0.0 ? row / diagonal : 0.0;
    else if (one_sided && column > 0.0)
      wanted = diagonal / column;
    if (wanted == 0.0) return false;
    const double factor = power_of_two_near(wanted);
    if (factor == 1.0 || (!one_sided && column * factor + row / factor >= 0.95 * (column + row))) return false;
    scale(i) *= factor;
    a.col(i) *= factor;
    c.col(i) *= factor;
    a.row(i) /= factor;
    b.row(i) /= factor;
    return true;
  };
  bool again = true;
  for (int sweep = 0; again && sweep < 100; ++sweep) {
    again = false;
    for (Eigen::Index i = 0; i < n; ++i) again = step(i, false) || again;
  }
  for (Eigen::Index i = 0; i < n; ++i) step(i, true);
  return scale;
}

}  // namespace

Vector balancing_scale(const Matrix& a) { return scale_of(a, Matrix(a.rows(), 0), Matrix(0, a.rows())); }

BalancedUnits in_balanced_units(const System& given) {
  const auto n = given.order(), m = given.inputs(), p = given.outputs();
  BalancedUnits out{given, Vector::Ones(n), Vector::Ones(m), Vector::Ones(p)};
  System& s = out.system;
  const auto rescale = [&](const Vector& scale) {
    const Vector inverse = scale.cwiseInverse();
    s.A = inverse.asDiagonal() * s.A * scale.asDiagonal();
    s.B = inverse.asDiagonal() * s.B;
    s.C = s.C * scale.asDiagonal();
    out.state = out.state.cwiseProduct(scale);
  };
  // A by itself first. Then in turns: the states' units decide how large a column of B is, and B's columns how large a
  // state is.
  rescale(balancing_scale(s.A));
  for (int round = 0; round < 4; ++round) {
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
    const Vector scale = scale_of(s.A, s.B, s.C);
    if (scale == Vector::Ones(n) && round > 0) break;
    rescale(scale);
  }
  s.D = out.output.cwiseInverse().asDiagonal() * given.D * out.input.asDiagonal();
  return out;
}

}  // namespace slipbench::linear
