#include "plant/linear/stable_subspace.hpp"

#include <Eigen/Dense>
#include <algorithm>
#include <numeric>

#include "plant/linear/schur.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

using Index = Eigen::Index;

struct Pencil {
  Matrix M, L;  // 2n x 2n
};

Pencil compressed(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N, bool discrete) {
  const auto n = A.rows(), m = B.cols(), size = 2 * n + m;
  const Matrix I = Matrix::Identity(n, n), O = Matrix::Zero(n, n);
  Matrix M(size, 2 * n), L = Matrix::Zero(size, 2 * n), column(size, m);
  M << A, O, -Q, (discrete ? I : Matrix(-A.transpose())), N.transpose(),
      (discrete ? Matrix(Matrix::Zero(m, n)) : Matrix(B.transpose()));
  L.topLeftCorner(n, n) = I;
  L.block(n, n, n, n) = discrete ? Matrix(A.transpose()) : I;
  if (discrete) L.bottomRightCorner(m, n) = -B.transpose();
  if (m == 0) return {M, L};
  column << B, -N, R;
  const Matrix full = column.householderQr().householderQ() * Matrix::Identity(size, size);
  const Matrix rest = full.rightCols(2 * n).transpose();
  return {rest * M, rest * L};
}

// The mapped matrix, and how to map its eigenvalues back.
struct Mapped {
  Matrix S;
  bool discrete;
  double sign = 1.0;
  [[nodiscard]] Complex back(Complex e) const { return discrete ? sign * (1.0 + e) / (1.0 - e) : e; }
};

Mapped mapped(const Pencil& p, bool discrete) {
  if (!discrete) return {p.L.partialPivLu().solve(p.M), false};
  const Eigen::PartialPivLU<Matrix> plus(p.M + p.L), minus(p.M - p.L);
  if (plus.rcond() >= minus.rcond()) return {plus.solve(p.M - p.L), true, 1.0};
  return {minus.solve(p.M + p.L), true, -1.0};
}

// The plane of rows and columns k, k + 1 is turned by the unitary rotation whose first column is along (c, d).
void turn(ComplexMatrix& T, ComplexMatrix& U, Index k, Complex c, Complex d) {
  const double r = slipbench::sqrt(std::norm(c) + std::norm(d));
  if (r == 0.0) return;
  const Complex cs = c / r, sn = d / r;
  Eigen::Matrix2cd G;
  G << cs, -std::conj(sn), sn, std::conj(cs);
  T.middleCols(k, 2) = (T.middleCols(k, 2) * G).eval();
  T.middleRows(k, 2) = (G.adjoint() * T.middleRows(k, 2)).eval();
  U.middleCols(k, 2) = (U.middleCols(k, 2) * G).eval();
  T(k + 1, k) = 0.0;
}

void swap(ComplexMatrix& T, ComplexMatrix& U, Index k) {
  const Complex a = T(k, k), b = T(k + 1, k + 1);
  turn(T, U, k, T(k, k + 1), b - a);
  T(k, k) = b;
  T(k + 1, k + 1) = a;
}

// Pairs on the diagonal of a real Schur form are parted. (Eigen's complex form calls the C library's complex root.)
void triangular(ComplexMatrix& T, ComplexMatrix& U) {
  for (Index k = 0; k + 1 < T.rows(); ++k) {
    if (T(k + 1, k) == 0.0) continue;
    const double a = T(k, k).real(), b = T(k, k + 1).real(), c = T(k + 1, k).real(), d = T(k + 1, k + 1).real();
    const double mean = 0.5 * (a + d), half = 0.5 * (a - d), inside = half * half + b * c;
    const double root = slipbench::sqrt(std::abs(inside));
    const Complex first = inside < 0.0 ? Complex(mean, root) : Complex(mean + root);
    turn(T, U, k, b, first - a);
    T(k, k) = first;
    T(k + 1, k + 1) = inside < 0.0 ? std::conj(first) : Complex(mean - root);
  }
}

void stable_first(ComplexMatrix& T, ComplexMatrix& U) {
  Index front = 0;
  for (Index i = 0; i < T.rows(); ++i) {
    if (T(i, i).real() >= 0.0) continue;
    for (Index k = i; k > front; --k) swap(T, U, k - 1);
    ++front;
  }
}

void refuse_limit(const ComplexMatrix& T, const Mapped& map) {
  const auto n = T.rows() / 2;
  Index stable = 0, nearest = 0;
  for (Index i = 0; i < T.rows(); ++i) {
    if (T(i, i).real() < 0.0) ++stable;
    if (std::abs(T(i, i).real()) < std::abs(T(nearest, nearest).real())) nearest = i;
  }
  // Rounding moves an eigenvalue by about the unit times the norm; nearer than that it can't be told from the limit.
  const double doubt = 16.0 * 0x1p-52 * T.norm();
  if (stable == n && std::abs(T(nearest, nearest).real()) > doubt) return;
  throw LinearError("no stabilising solution: the equation's pencil has an eigenvalue at " +
                    text_of(map.back(T(nearest, nearest))) +
                    (map.discrete ? ", on the unit circle" : ", on the imaginary axis") +
                    ": a mode there is not stabilised, or no weight sees it");
}

}  // namespace

Matrix riccati_subspace(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N,
                        bool discrete) {
  const auto n = A.rows();
  if (n == 0) return Matrix(0, 0);
  const auto map = mapped(compressed(A, B, Q, R, N, discrete), discrete);
  if (!map.S.allFinite())
    throw LinearError(discrete
                          ? "no stabilising solution: the equation's pencil is singular or has eigenvalues at 1 and -1"
                          : "no solution: R is singular to working precision");
  const RealSchurForm schur = real_schur(map.S);
  ComplexMatrix T = schur.T.cast<Complex>(), U = schur.U.cast<Complex>();
  triangular(T, U);
  refuse_limit(T, map);
  stable_first(T, U);
  const ComplexMatrix first = U.topLeftCorner(n, n).transpose(), second = U.bottomLeftCorner(n, n).transpose();
  const Matrix X = first.householderQr().solve(second).real();
  return 0.5 * (X + X.transpose());
}

Vector riccati_balance(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R) {
  const auto n = A.rows();
  Vector d = Vector::Ones(n);
  Matrix G = Matrix::Zero(n, n);
  if (B.cols() > 0) {
    const Eigen::FullPivLU<Matrix> lu(R);
    G = lu.isInvertible() ? Matrix(B * lu.solve(B.transpose())) : Matrix(B * B.transpose());
  }
  Matrix a = A.cwiseAbs(), g = G.cwiseAbs(), q = Q.cwiseAbs();
  for (int sweep = 0; sweep < 20; ++sweep) {
    bool changed = false;
    for (Index i = 0; i < n; ++i) {
      const double out = a.row(i).sum() - a(i, i) + g.row(i).sum(), in = a.col(i).sum() - a(i, i) + q.col(i).sum();
      if (!(out > 0.0) || !(in > 0.0)) continue;
      const double f = two_to_the(slipbench::floor(0.5 + 0.5 * exponent_of(out / in)));
      if (f == 1.0) continue;
      d(i) *= f;
      a.col(i) *= f, a.row(i) /= f;
      q.col(i) *= f, q.row(i) *= f;
      g.col(i) /= f, g.row(i) /= f;
      changed = true;
    }
    if (!changed) break;
  }
  return d;
}

}  // namespace slipbench::linear
