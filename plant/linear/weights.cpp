#include "plant/linear/weights.hpp"

#include <Eigen/Dense>
#include <algorithm>
#include <cstdio>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/staircase.hpp"

namespace slipbench::linear {
namespace {

std::string short_text(double value) {
  char text[32];
  std::snprintf(text, sizeof text, "%.4g", value);
  return text;
}

// Smallest and largest.
std::pair<double, double> extremes(const Matrix& m) {
  if (m.size() == 0) return {1.0, 1.0};
  const auto values = Eigen::SelfAdjointEigenSolver<Matrix>(m, Eigen::EigenvaluesOnly).eigenvalues();
  return {values.minCoeff(), values.cwiseAbs().maxCoeff()};
}

}  // namespace

void expect_weight(const char* name, const Matrix& weight, Eigen::Index size) {
  const auto wanted = std::to_string(size) + " x " + std::to_string(size);
  if (weight.rows() != size || weight.cols() != size)
    throw LinearError(std::string(name) + " is " + std::to_string(weight.rows()) + " x " +
                      std::to_string(weight.cols()) + ", but must be " + wanted);
  if (!weight.allFinite()) throw LinearError(std::string(name) + " holds a number that is not finite");
  if ((weight - weight.transpose()).norm() > 1e-10 * weight.norm())
    throw LinearError(std::string(name) + " must be symmetric");
}

void expect_definite(const char* name, const Matrix& weight) {
  const auto [least, size] = extremes(weight);
  if (least > 1e-14 * size) return;
  throw LinearError(std::string(name) + " must be positive definite, but has the eigenvalue " + short_text(least));
}

void expect_semidefinite(const char* name, const Matrix& weight) {
  const auto [least, size] = extremes(weight);
  if (least >= -1e-12 * size) return;
  throw LinearError(std::string(name) + " must not be negative in any direction, but has the eigenvalue " +
                    short_text(least));
}

double smallest_eigenvalue(const Matrix& symmetric) {
  const auto [least, size] = extremes(symmetric);
  return least > 1e-14 * size ? least : 0.0;
}

void refuse_unseen_limit(const Matrix& A, const Matrix& seen, bool discrete, const std::string& why,
                         const System& names) {
  const auto n = A.rows();
  System pair;
  pair.A = A;
  pair.B = Matrix::Zero(n, 0);
  pair.C = seen;
  pair.D = Matrix::Zero(seen.rows(), 0);
  const auto units = in_balanced_units(pair);
  const auto& balanced = units.system;
  const auto stairs = observable_staircase(balanced.A, balanced.C);
  const auto hidden = n - stairs.rank;
  if (hidden == 0) return;
  const Matrix basis = stairs.T.rightCols(hidden), block = basis.transpose() * balanced.A * basis;
  const double tolerance = 1e-10 * std::max(balanced.A.norm(), discrete ? 1.0 : 0.0);
  for (const auto pole : eigenvalues(block)) {
    const double distance = discrete ? magnitude(pole) - 1.0 : pole.real();
    if (std::abs(distance) > tolerance) continue;
    // The mode's direction within the hidden states.
    const ComplexMatrix shifted = block.cast<Complex>() - pole * ComplexMatrix::Identity(hidden, hidden);
    const ComplexMatrix kernel = Eigen::JacobiSVD<ComplexMatrix>(shifted, Eigen::ComputeFullV).matrixV().rightCols<1>();
    const Vector direction = units.state.asDiagonal() * (basis * kernel.cwiseAbs2().cwiseSqrt());
    throw LinearError("the mode at " + text_of(pole) + ", on the " + (discrete ? "unit circle" : "imaginary axis") +
                      " (" + direction_text(names, direction) + "), " + why);
  }
}

}  // namespace slipbench::linear
