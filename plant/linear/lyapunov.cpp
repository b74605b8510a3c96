#include "plant/linear/lyapunov.hpp"

#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <cmath>
#include <limits>

#include "plant/linear/dense.hpp"
#include "plant/linear/schur.hpp"

namespace slipbench::linear {
namespace {

constexpr double eps = std::numeric_limits<double>::epsilon();

// A = U S U', S block upper triangular with blocks of one real or two conjugate eigenvalues.
struct Schur {
  Matrix U, S;
  std::vector<Eigen::Index> at;  // first row of each block, and n
};

Schur schur_of(const Matrix& a) {
  RealSchurForm of = real_schur(a);
  Schur out{std::move(of.U), std::move(of.T), {}};
  for (Eigen::Index i = 0; i < a.rows(); ++i)
    if (i == 0 || out.S(i, i - 1) == 0.0) out.at.push_back(i);
  out.at.push_back(a.rows());
  return out;
}

std::vector<Complex> values_of(const Schur& s) {
  std::vector<Complex> out;
  for (std::size_t b = 0; b + 1 < s.at.size(); ++b) {
    const auto i = s.at[b];
    if (s.at[b + 1] - i == 1) {
      out.emplace_back(s.S(i, i));
      continue;
    }
    const double mean = 0.5 * (s.S(i, i) + s.S(i + 1, i + 1)), half = 0.5 * (s.S(i, i) - s.S(i + 1, i + 1));
    const double inside = half * half + s.S(i, i + 1) * s.S(i + 1, i);
    const double root = std::sqrt(std::fabs(inside));
    for (const double sign : {1.0, -1.0})
      out.push_back(inside < 0.0 ? Complex(mean, sign * root) : Complex(mean + sign * root));
  }
  return out;
}

// A block of one or two rows and columns: its equation written out over the stacked columns.
Matrix solve_small(const Matrix& kron, const Matrix& f) {
  const Vector x = Eigen::FullPivLU<Matrix>(kron).solve(f.reshaped().eval());
  return x.reshaped(f.rows(), f.cols());
}

Matrix kronecker(const Matrix& a, const Matrix& b) {
  Matrix out(a.rows() * b.rows(), a.cols() * b.cols());
  for (Eigen::Index i = 0; i < a.rows(); ++i)
    for (Eigen::Index j = 0; j < a.cols(); ++j) out.block(i * b.rows(), j * b.cols(), b.rows(), b.cols()) = a(i, j) * b;
  return out;
}

Matrix identity(Eigen::Index n) { return Matrix::Identity(n, n); }

bool symmetric(const Matrix& q) { return q == q.transpose(); }

}  // namespace

Matrix sylvester(const Matrix& A, const Matrix& B, const Matrix& Q) {
  if (Q.size() == 0) return Q;
  const Schur a = schur_of(A), b = schur_of(B);
  const double least = eps * static_cast<double>(A.rows() + B.rows()) * (A.norm() + B.norm());
  for (const Complex& p : values_of(a))
    for (const Complex& q : values_of(b))
      if (magnitude(p + q) <= least)
        throw LinearError("A X + X B + Q = 0 has no single solution: the poles " + text_of(p) + " and " + text_of(q) +
                          " sum to zero");
  Matrix y = a.U.transpose() * Q * b.U;
  for (std::size_t j = 0; j + 1 < b.at.size(); ++j)
    for (std::size_t i = a.at.size() - 1; i-- > 0;) {
      const auto row = a.at[i], rows = a.at[i + 1] - row, below = A.rows() - row - rows;
      const auto column = b.at[j], columns = b.at[j + 1] - column;
      Matrix f = -y.block(row, column, rows, columns);
      f -= a.S.block(row, row + rows, rows, below) * y.block(row + rows, column, below, columns);
      f -= y.block(row, 0, rows, column) * b.S.block(0, column, column, columns);
      const Matrix s = a.S.block(row, row, rows, rows), r = b.S.block(column, column, columns, columns);
      y.block(row, column, rows, columns) =
          solve_small(kronecker(identity(columns), s) + kronecker(r.transpose(), identity(rows)), f);
    }
  return a.U * y * b.U.transpose();
}

Matrix lyapunov(const Matrix& A, const Matrix& Q) {
  const Matrix x = sylvester(A, A.transpose(), Q);
  return symmetric(Q) ? Matrix(0.5 * (x + x.transpose())) : x;
}

Matrix stein(const Matrix& A, const Matrix& Q) {
  if (Q.size() == 0) return Q;
  const Schur a = schur_of(A);
  const auto values = values_of(a);
  const double size = A.norm(), least = eps * static_cast<double>(A.rows()) * (1.0 + size * size);
  for (const Complex& p : values)
    for (const Complex& q : values)
      if (magnitude(p * q - 1.0) <= least)
        throw LinearError("A X A' - X + Q = 0 has no single solution: the product of the poles " + text_of(p) +
                          " and " + text_of(q) + " is one");
  const auto n = A.rows();
  Matrix y = a.U.transpose() * Q * a.U;
  for (std::size_t j = a.at.size() - 1; j-- > 0;) {
    const auto column = a.at[j], columns = a.at[j + 1] - column, right = n - column - columns;
    const Matrix known = a.S * (y.rightCols(right) * a.S.block(column, column + columns, columns, right).transpose());
    const Matrix r = a.S.block(column, column, columns, columns);
    for (std::size_t i = a.at.size() - 1; i-- > 0;) {
      const auto row = a.at[i], rows = a.at[i + 1] - row, below = n - row - rows;
      Matrix f = -y.block(row, column, rows, columns) - known.middleRows(row, rows);
      f -= a.S.block(row, row + rows, rows, below) * y.block(row + rows, column, below, columns) * r.transpose();
      const Matrix s = a.S.block(row, row, rows, rows);
      y.block(row, column, rows, columns) = solve_small(kronecker(r, s) - identity(rows * columns), f);
    }
  }
  const Matrix x = a.U * y * a.U.transpose();
  return symmetric(Q) ? Matrix(0.5 * (x + x.transpose())) : x;
}

double lyapunov_residual(const Matrix& A, const Matrix& X, const Matrix& Q) {
  const double size = 2.0 * A.norm() * X.norm() + Q.norm();
  return size > 0.0 ? (A * X + X * A.transpose() + Q).norm() / size : 0.0;
}

double stein_residual(const Matrix& A, const Matrix& X, const Matrix& Q) {
  const double size = A.norm() * A.norm() * X.norm() + X.norm() + Q.norm();
  return size > 0.0 ? (A * X * A.transpose() - X + Q).norm() / size : 0.0;
}

}  // namespace slipbench::linear
