#include "plant/linear/schur.hpp"

#include <Eigen/Eigenvalues>

#include "plant/math/numbers.hpp"

namespace slipbench::linear {
namespace {

constexpr int attempts = 5;

// The first attempt looks straight at the matrix.
Matrix reflection(Eigen::Index size, int attempt) {
  if (attempt == 0) return Matrix::Identity(size, size);
  Vector v(size);
  for (Eigen::Index i = 0; i < size; ++i) {
    const double x = 0.6180339887498949 * static_cast<double>(attempt * (i + 1));  // golden section: no two alike
    v(i) = 0.25 + x - slipbench::floor(x);
  }
  return Matrix::Identity(size, size) - 2.0 / v.squaredNorm() * v * v.transpose();
}

template <class Solver, class Take>
void solve(const Matrix& S, const Take& take) {
  for (int attempt = 0; attempt < attempts; ++attempt) {
    const Matrix H = reflection(S.rows(), attempt);
    const Solver solver(attempt == 0 ? S : Matrix(H * S * H));
    if (solver.info() == Eigen::Success) return take(solver, H, attempt == 0);
  }
  throw LinearError("a Schur form did not converge: is every number finite?");
}

}  // namespace

RealSchurForm real_schur(const Matrix& S) {
  RealSchurForm out;
  if (S.rows() == 0) return {S, S};
  solve<Eigen::RealSchur<Matrix>>(S, [&](const auto& found, const Matrix& H, bool plain) {
    out = {plain ? found.matrixU() : Matrix(H * found.matrixU()), found.matrixT()};
  });
  return out;
}

Eigenpairs eigenpairs(const Matrix& S) {
  Eigenpairs out;
  if (S.rows() == 0) return {Eigen::VectorXcd(0), ComplexMatrix(0, 0)};
  solve<Eigen::EigenSolver<Matrix>>(S, [&](const auto& found, const Matrix& H, bool plain) {
    out = {found.eigenvalues(), plain ? ComplexMatrix(found.eigenvectors()) : ComplexMatrix(H * found.eigenvectors())};
  });
  return out;
}

}  // namespace slipbench::linear
