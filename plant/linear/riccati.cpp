#include "plant/linear/riccati.hpp"

#include <Eigen/Dense>
#include <algorithm>
#include <cstdio>

#include "plant/linear/dense.hpp"
#include "plant/linear/lyapunov.hpp"
#include "plant/linear/stable_subspace.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

constexpr double unit = 0x1p-52;

// The equation with its weights, in whatever coordinates.
struct Problem {
  Matrix A, B, Q, R, N;
  bool discrete;
};

std::string short_text(double value) {
  char text[32];
  std::snprintf(text, sizeof text, "%.2g", value);
  return text;
}

void expect_shape(const char* name, const Matrix& m, Eigen::Index rows, Eigen::Index columns) {
  if (m.rows() != rows || m.cols() != columns)
    throw LinearError(std::string(name) + " is " + std::to_string(m.rows()) + " x " + std::to_string(m.cols()) +
                      ", but must be " + std::to_string(rows) + " x " + std::to_string(columns));
  if (!m.allFinite()) throw LinearError(std::string(name) + " holds a number that is not finite");
}

Matrix symmetric(const char* name, const Matrix& m) {
  if ((m - m.transpose()).norm() > 1e-10 * m.norm()) throw LinearError(std::string(name) + " must be symmetric");
  return 0.5 * (m + m.transpose());
}

Problem checked(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N, bool discrete) {
  const auto n = A.rows(), m = B.cols();
  const Matrix cross = N.size() == 0 ? Matrix(Matrix::Zero(n, m)) : N;
  expect_shape("A", A, n, n);
  expect_shape("B", B, n, m);
  expect_shape("Q", Q, n, n);
  expect_shape("R", R, m, m);
  expect_shape("N", cross, n, m);
  return {A, B, symmetric("Q", Q), symmetric("R", R), cross, discrete};
}

// What is inverted: R, or R + B'X B.
Matrix weight(const Problem& p, const Matrix& X) { return p.discrete ? Matrix(p.R + p.B.transpose() * X * p.B) : p.R; }

// The size its rounding is measured by: the terms can cancel.
double weight_scale(const Problem& p, const Matrix& X) {
  return p.R.norm() + (p.discrete ? (p.B.transpose() * X).norm() * p.B.norm() : 0.0);
}

Matrix gain(const Problem& p, const Matrix& X) {
  if (p.B.size() == 0) return Matrix::Zero(p.B.cols(), p.A.rows());
  const Matrix right =
      p.B.transpose() * X * (p.discrete ? p.A : Matrix::Identity(p.A.rows(), p.A.rows())) + p.N.transpose();
  return weight(p, X).fullPivLu().solve(right);
}

constexpr const char* idle =
    "R + B'X B is singular: some combination of the inputs has neither weight nor effect; give it a weight in R or "
    "leave it "
    "out of B";

void refuse_singular_weight(const Problem& p, const Matrix& X) {
  if (p.B.cols() == 0) return;
  const double scale = weight_scale(p, X), smallest = singular_values(weight(p, X)).minCoeff();
  if (smallest > 1e-14 * scale) return;
  if (p.discrete) throw LinearError(idle);
  throw LinearError("R is singular (smallest singular value " + short_text(smallest) +
                    "): every combination of the inputs needs a weight");
}

// Before X is known: [B; N; R] without full column rank leaves R + B'X B singular for every X.
void refuse_idle_input(const Problem& p) {
  if (p.B.cols() == 0 || p.B.rows() == 0) return;
  Matrix column(2 * p.B.rows() + p.B.cols(), p.B.cols());
  column << p.B, p.N, p.R;
  const auto values = singular_values(column);
  if (!(values.minCoeff() > 1e-14 * values.maxCoeff())) throw LinearError(idle);
}

struct Residual {
  Matrix left;
  double relative = 0.0;
};

Residual residual(const Problem& p, const Matrix& X) {
  const Matrix K = gain(p, X), W = K.transpose() * weight(p, X) * K;
  const Matrix AX = p.discrete ? Matrix(p.A.transpose() * X * p.A) : Matrix(p.A.transpose() * X);
  Matrix left = p.discrete ? Matrix(AX - X - W + p.Q) : Matrix(AX + AX.transpose() - W + p.Q);
  left = (0.5 * (left + left.transpose())).eval();
  const double terms = (p.discrete ? AX.norm() + X.norm() : 2.0 * AX.norm()) + W.norm() + p.Q.norm();
  return {left, terms > 0.0 ? left.norm() / terms : 0.0};
}

bool stable(const Problem& p, const Matrix& closed) {
  for (const auto pole : eigenvalues(closed))
    if (!(p.discrete ? magnitude(pole) < 1.0 : pole.real() < 0.0)) return false;
  return true;
}

// Each step solves for the correction E of X: Ac'E + E Ac (or Ac'E Ac - E) + residual = 0.
Matrix refined(const Problem& p, Matrix X) {
  auto now = residual(p, X);
  for (int step = 0; step < 6 && now.relative > 0.0; ++step) {
    const Matrix closed = (p.A - p.B * gain(p, X)).transpose();
    if (!stable(p, closed)) break;
    const Matrix E = p.discrete ? stein(closed, now.left) : lyapunov(closed, now.left);
    const Matrix next = X + 0.5 * (E + E.transpose());
    if (!next.allFinite()) break;
    const auto then = residual(p, next);
    if (!(then.relative < now.relative) || !stable(p, p.A - p.B * gain(p, next))) break;
    X = next;
    now = then;
  }
  return X;
}

// First-order bound of |dX| / |X| over relative changes of the data: the residual is stationary in K, so that
// dX = W^-1(dQ + K'dR K - dN K - K'dN' + (dA - dB K)'X Ac + its transpose), |W^-1| = |W^-1(I)|, and for terms Z'X Ac
// 2 sqrt(|W^-1(I)| |W^-1(Ac'X X Ac)|) (Ac = I there in continuous time).
double condition(const Problem& p, const Matrix& X) {
  const auto n = X.rows();
  const double size = X.norm();
  if (n == 0 || size == 0.0) return 1.0;
  const Matrix K = gain(p, X), closed = p.A - p.B * K, I = Matrix::Identity(n, n);
  if (!stable(p, closed)) return 1.0 / unit;
  const Matrix ct = closed.transpose(), XA = p.discrete ? Matrix(X * closed) : X, XX = XA.transpose() * XA;
  const double h0 = (p.discrete ? stein(ct, I) : lyapunov(ct, I)).norm();
  const double h2 = (p.discrete ? stein(ct, XX) : lyapunov(ct, XX)).norm();
  const double k = K.norm(), weights = p.Q.norm() + k * k * p.R.norm() + 2.0 * k * p.N.norm();
  return std::max(1.0, (h0 * weights + 2.0 * slipbench::sqrt(h0 * h2) * (p.A.norm() + k * p.B.norm())) / size);
}

// x = D z.
Problem scaled(const Problem& p, const Vector& d) {
  const auto D = d.asDiagonal();
  const auto inverse = d.cwiseInverse().asDiagonal();
  return {inverse * p.A * D, inverse * p.B, D * p.Q * D, p.R, D * p.N, p.discrete};
}

// Powers of two, so that scaling does not round: such that X has a diagonal near one.
Vector scales_from(const Matrix& X) {
  Vector d = Vector::Ones(X.rows());
  const double floor = 1e-30 * X.norm();
  for (Eigen::Index i = 0; i < d.size(); ++i) {
    const double size =
        X.row(i).cwiseAbs().maxCoeff() > floor ? std::max(std::abs(X(i, i)), 1e-8 * X.row(i).norm()) : 1.0;
    d(i) = two_to_the(slipbench::floor(0.5 - 0.5 * exponent_of(size)));
  }
  return d;
}

Riccati solved(const Problem& given) {
  const auto n = given.A.rows();
  if (given.discrete)
    refuse_idle_input(given);
  else
    refuse_singular_weight(given, Matrix::Zero(n, n));
  Vector d = riccati_balance(given.A, given.B, given.Q, given.R);
  Matrix best;
  double lowest = 0.0, trust = 1.0;
  // The first X tells the size each state should have had; with that the subspace is found again.
  for (int pass = 0; pass < 3; ++pass) {
    const auto p = scaled(given, d);
    const Matrix Z = refined(p, riccati_subspace(p.A, p.B, p.Q, p.R, p.N, p.discrete));
    const auto inverse = d.cwiseInverse().asDiagonal();
    const double now = residual(p, Z).relative;
    const Matrix X = inverse * Z * inverse;
    if (pass == 0 || now < lowest) best = X, lowest = now, trust = condition(p, Z);
    const Vector next = scales_from(X);
    if (next == d) break;
    d = next;
  }
  refuse_singular_weight(given, best);
  Riccati r;
  r.X = best;
  r.K = gain(given, best);
  r.residual = residual(given, best).relative;
  r.condition = trust;
  r.closed_loop_poles = eigenvalues(given.A - given.B * r.K);
  for (const auto pole : r.closed_loop_poles)
    if (!(given.discrete ? magnitude(pole) < 1.0 : pole.real() < 0.0))
      throw LinearError("no stabilising solution was found: the closed loop keeps a pole at " + text_of(pole));
  const double error = r.condition * unit;
  if (r.residual > 1e-10)
    r.warning = "do not trust this solution: its relative residual is " + short_text(r.residual) + " (condition " +
                short_text(r.condition) + ")";
  else if (error > 1e-6)
    r.warning = "ill-conditioned: rounding of the data alone may change the solution by " + short_text(error) +
                " relative (condition " + short_text(r.condition) + ", residual " + short_text(r.residual) + ")";
  return r;
}

}  // namespace

Riccati care(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N) {
  return solved(checked(A, B, Q, R, N, false));
}

Riccati dare(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N) {
  return solved(checked(A, B, Q, R, N, true));
}

Matrix care_residual(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N,
                     const Matrix& X) {
  return residual(checked(A, B, Q, R, N, false), X).left;
}

Matrix dare_residual(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N,
                     const Matrix& X) {
  return residual(checked(A, B, Q, R, N, true), X).left;
}

}  // namespace slipbench::linear
