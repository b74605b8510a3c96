#include "plant/linear/robust_eigenvectors.hpp"

#include <Eigen/Dense>
#include <cstdint>
#include <limits>

#include "plant/linear/dense.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

using Index = Eigen::Index;
constexpr int starts = 6, sweeps = 60;
constexpr double sqrt2 = 0x1.6a09e667f3bcdp+0;

// Fixed draws in (-1, 1), the same on every machine: minimal standard generator (S.K. Park, K.W. Miller, CACM 31 1988).
class Draws {
 public:
  double operator()() {
    state_ = state_ * 16807 % 2147483647;
    return static_cast<double>(state_) / 1073741823.5 - 1.0;
  }

 private:
  std::uint64_t state_ = 1;
};

ComplexMatrix kernel(const ComplexMatrix& rows, Index n) {
  if (rows.rows() == 0) return ComplexMatrix::Identity(n, n);
  const ComplexMatrix Q = rows.adjoint().householderQr().householderQ() * ComplexMatrix::Identity(n, n);
  return Q.rightCols(n - rows.rows());
}

struct Column {
  Index at;         // its place in X
  bool pair;        // takes two places
  ComplexMatrix S;  // n x r; real numbers for a real pole
};

void set(Matrix& X, const Column& c, const Eigen::VectorXcd& w) {
  const Eigen::VectorXcd x = (c.S * w).normalized();
  if (!c.pair) {
    X.col(c.at) = x.real().normalized();
    return;
  }
  X.col(c.at) = sqrt2 * x.real();
  X.col(c.at + 1) = sqrt2 * x.imag();
}

// Orthonormal complement of all columns of X but a and b.
Matrix complement(const Matrix& X, Index a, Index b) {
  const auto n = X.rows();
  Matrix rest(n, n - 2);
  for (Index j = 0, k = 0; j < n; ++j)
    if (j != a && j != b) rest.col(k++) = X.col(j);
  if (n == 2) return Matrix::Identity(2, 2);
  const Matrix Q = rest.householderQr().householderQ() * Matrix::Identity(n, n);
  return Q.rightCols(2);
}

void improve_two(Matrix& X, const Column& one, const Column& two) {
  const Matrix Q = complement(X, one.at, two.at);
  Matrix J(2, 2);
  J << 0.0, 1.0, -1.0, 0.0;
  const Matrix M = one.S.real().transpose() * Q * J * Q.transpose() * two.S.real();
  const Eigen::JacobiSVD<Matrix> best(M, Eigen::ComputeFullU | Eigen::ComputeFullV);
  if (!(best.singularValues()(0) > 0.0)) return;
  set(X, one, best.matrixU().col(0).cast<Complex>());
  set(X, two, best.matrixV().col(0).cast<Complex>());
}

void improve_pair(Matrix& X, const Column& c) {
  const Matrix Q = complement(X, c.at, c.at + 1);
  ComplexMatrix J(2, 2);
  J << 0.0, Complex(0.0, 0.5), Complex(0.0, -0.5), 0.0;
  const ComplexMatrix M = c.S.adjoint() * Q * J * Q.transpose() * c.S;
  // As a real symmetric matrix of twice the size: Eigen's Hermitian solver scales by the C library's complex magnitude.
  const auto r = M.rows();
  Matrix both(2 * r, 2 * r);
  both << M.real(), -M.imag(), M.imag(), M.real();
  const Eigen::SelfAdjointEigenSolver<Matrix> solver(0.5 * (both + both.transpose()));
  Index best = 0;
  solver.eigenvalues().cwiseAbs().maxCoeff(&best);
  if (!(std::abs(solver.eigenvalues()(best)) > 0.0)) return;
  const Vector w = solver.eigenvectors().col(best);
  set(X, c, w.head(r).cast<Complex>() + Complex(0.0, 1.0) * w.tail(r).cast<Complex>());
}

void improve_one(Matrix& X, const Column& c) {
  const auto n = X.rows();
  if (n == 1) return;
  const Matrix Q = complement(X, c.at, c.at == 0 ? 1 : 0);
  // Within the plane left by all others but one, the direction that this one lacks.
  const Vector other = Q.transpose() * X.col(c.at == 0 ? 1 : 0);
  const Vector normal = Q.col(0) * -other(1) + Q.col(1) * other(0);
  const Vector w = c.S.real().transpose() * normal;
  if (w.norm() > 0.0) set(X, c, w.cast<Complex>());
}

// A column is replaced only where the volume grows, but for rounding: each step is the exact best.
void ascend(Matrix& X, const std::vector<Column>& columns) {
  std::vector<const Column*> real, pairs;
  for (const auto& c : columns) (c.pair ? pairs : real).push_back(&c);
  double volume = std::abs(X.determinant());
  for (int sweep = 0; sweep < sweeps; ++sweep) {
    if (real.size() == 1) improve_one(X, *real[0]);
    for (std::size_t i = 0; real.size() > 1 && i < real.size(); ++i)
      improve_two(X, *real[i], *real[(i + 1 + static_cast<std::size_t>(sweep) % (real.size() - 1)) % real.size()]);
    for (const auto* c : pairs) improve_pair(X, *c);
    const double now = std::abs(X.determinant());
    if (sweep > static_cast<int>(real.size()) && now <= volume * (1.0 + 1e-9)) break;
    volume = now;
  }
}

}  // namespace

Eigenvectors robust_eigenvectors(const Matrix& A, const Matrix& U, const std::vector<Complex>& poles) {
  const auto n = A.rows();
  Eigenvectors best;
  best.blocks = Matrix::Zero(n, n);
  best.condition = std::numeric_limits<double>::infinity();
  std::vector<Column> columns;
  for (Index i = 0; i < n; ++i) {
    const auto p = poles[static_cast<std::size_t>(i)];
    const bool pair = p.imag() != 0.0;
    const ComplexMatrix shifted = A.cast<Complex>() - p * ComplexMatrix::Identity(n, n);
    columns.push_back({i, pair, kernel(U.transpose().cast<Complex>() * shifted, n)});
    best.blocks(i, i) = p.real();
    if (!pair) continue;
    best.blocks(i + 1, i + 1) = p.real();
    best.blocks(i, i + 1) = p.imag();
    best.blocks(i + 1, i) = -p.imag();
    ++i;
  }
  Draws draw;
  for (int start = 0; start < starts; ++start) {
    Matrix X(n, n);
    for (const auto& c : columns) {
      Eigen::VectorXcd w(c.S.cols());
      for (auto& v : w) {
        const double re = draw(), im = draw();
        v = Complex(re, c.pair ? im : 0.0);
      }
      set(X, c, w);
    }
    ascend(X, columns);
    const double now = condition_number(X);
    if (now < best.condition) best.X = X, best.condition = now;
  }
  return best;
}

}  // namespace slipbench::linear
