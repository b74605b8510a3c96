#include "plant/linear/dense.hpp"

#include <Eigen/Eigenvalues>
#include <Eigen/SVD>
#include <algorithm>
#include <cstdio>
#include <limits>

#include "plant/linear/balance.hpp"
#include "plant/linear/schur.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {

double rank_tolerance(Eigen::Index rows, Eigen::Index columns) {
  return trusted_digits * static_cast<double>(std::max<Eigen::Index>({1, rows, columns}));
}

Svd svd(const Matrix& m) {
  if (m.size() == 0) return {Matrix::Identity(m.rows(), m.rows()), Matrix::Identity(m.cols(), m.cols()), Vector()};
  // The default preconditioner has no full U and V for matrices that are not square.
  const Eigen::JacobiSVD<Matrix, Eigen::FullPivHouseholderQRPreconditioner> of(
      m, Eigen::ComputeFullU | Eigen::ComputeFullV);
  return {of.matrixU(), of.matrixV(), of.singularValues()};
}

Vector singular_values(const Matrix& m) {
  if (m.size() == 0) return {};
  return Eigen::JacobiSVD<Matrix>(m).singularValues();
}

Vector singular_values(const ComplexMatrix& m) {
  if (m.size() == 0) return {};
  return Eigen::JacobiSVD<ComplexMatrix>(m).singularValues();
}

double largest_singular_value(const Matrix& m) { return m.size() == 0 ? 0.0 : singular_values(m)(0); }

double condition_number(const Matrix& m) {
  if (m.size() == 0) return 1.0;
  const Vector s = singular_values(m);
  const double least = s(s.size() - 1);
  return least > 0.0 ? s(0) / least : std::numeric_limits<double>::infinity();
}

Eigen::Index rank_of(const Matrix& m, double absolute_tolerance) {
  return (singular_values(m).array() > absolute_tolerance).count();
}

double one_norm(const Matrix& m) { return m.size() == 0 ? 0.0 : m.cwiseAbs().colwise().sum().maxCoeff(); }

double magnitude(Complex z) {
  const double a = std::max(std::fabs(z.real()), std::fabs(z.imag()));
  const double b = std::min(std::fabs(z.real()), std::fabs(z.imag()));
  if (a == 0.0) return 0.0;
  const double ratio = b / a;
  return a * std::sqrt(1.0 + ratio * ratio);
}

Complex unit_at(double angle_rad) {
  // sincos is good to 1e6 rad; further out whole turns are taken off first.
  constexpr double turn = 6.283185307179586;
  if (std::fabs(angle_rad) > 1e6) angle_rad -= turn * std::floor(angle_rad / turn);
  const auto at = slipbench::sincos(angle_rad);
  return {at.cos, at.sin};
}

Complex exponential_of(Complex z) { return slipbench::exp(z.real()) * unit_at(z.imag()); }

Complex logarithm_of(Complex z) { return {slipbench::log(magnitude(z)), slipbench::atan2(z.imag(), z.real())}; }

std::vector<Complex> eigenvalues(const Matrix& a) {
  std::vector<Complex> values;
  if (a.size() == 0) return values;
  const Vector scale = balancing_scale(a);
  const Matrix balanced = scale.cwiseInverse().asDiagonal() * a * scale.asDiagonal();
  for (const Complex& value : eigenpairs(balanced).values) values.push_back(value);
  std::sort(values.begin(), values.end(),
            [](Complex x, Complex y) { return x.real() != y.real() ? x.real() > y.real() : x.imag() > y.imag(); });
  return values;
}

std::string direction_text(const System& system, const Vector& direction) {
  const double length = direction.norm();
  if (length == 0.0) return "no state";
  std::vector<Eigen::Index> order(static_cast<std::size_t>(direction.size()));
  for (std::size_t i = 0; i < order.size(); ++i) order[i] = static_cast<Eigen::Index>(i);
  std::stable_sort(order.begin(), order.end(),
                   [&](Eigen::Index i, Eigen::Index j) { return std::fabs(direction(i)) > std::fabs(direction(j)); });
  const Vector weight = direction / (direction(order[0]) < 0.0 ? -length : length);
  if (weight(order[0]) * weight(order[0]) >= 0.9) return system.state_name(order[0]);
  std::string text = "a combination of ";
  // Up to four; what is below a twentieth is left unsaid.
  for (std::size_t k = 0; k < std::min<std::size_t>(4, order.size()); ++k) {
    if (std::fabs(weight(order[k])) < 0.05) break;
    char number[32];
    std::snprintf(number, sizeof number, " (%.2f)", weight(order[k]));
    text += (k ? ", " : "") + system.state_name(order[k]) + number;
  }
  return text;
}

}  // namespace slipbench::linear
