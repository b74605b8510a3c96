#include "plant/linear/descriptor.hpp"

#include <Eigen/LU>
#include <Eigen/QR>
#include <algorithm>
#include <cmath>
#include <cstdio>

#include "plant/linear/dense.hpp"
#include "plant/linear/descriptor_text.hpp"
#include "plant/linear/lyapunov.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

double power_of_two_below(double x) { return x > 0.0 ? two_to_the(exponent_of(x)) : 1.0; }

// Equations and variables in units that make their largest entries about one: x = diag(column) z. Exact.
struct Pencil {
  Matrix E, A, B;
  Vector column;
};

Pencil scaled(const Matrix& E, const System& s) {
  Pencil p{E, s.A, s.B, Vector::Ones(E.rows())};
  // E and A hold different units of time: compare them at a common size.
  const double pace = E.norm() > 0.0 && s.A.norm() > 0.0 ? s.A.norm() / E.norm() : 1.0;
  for (int sweep = 0; sweep < 3; ++sweep)
    for (Eigen::Index i = 0; i < E.rows(); ++i) {
      const double row = 1.0 / power_of_two_below(std::max(pace * p.E.row(i).norm(), p.A.row(i).norm()));
      p.E.row(i) *= row;
      p.A.row(i) *= row;
      p.B.row(i) *= row;
      const double column = 1.0 / power_of_two_below(std::max(pace * p.E.col(i).norm(), p.A.col(i).norm()));
      p.E.col(i) *= column;
      p.A.col(i) *= column;
      p.column(i) *= column;
    }
  return p;
}

// The shift among a few for which s0 E - A is best conditioned; a singular pencil is so for all of them.
double shift_for(const Pencil& p, const System& given, double tolerance) {
  const double pace = p.E.norm() > 0.0 && p.A.norm() > 0.0 ? p.A.norm() / p.E.norm() : 1.0;
  double best = 0.0, shift = 0.0;
  for (const double factor : {1.0, -0.7, 2.3, -1.9, 0.37, 0.0}) {
    const Vector s = singular_values(Matrix(factor * pace * p.E - p.A));
    if (const double quality = s(0) > 0.0 ? s(s.size() - 1) / s(0) : 0.0; quality > best) {
      best = quality;
      shift = factor * pace;
    }
  }
  if (best <= tolerance) {
    const Svd of = svd(pace * p.E - p.A);
    throw LinearError(
        undetermined_text(given, p.column.asDiagonal() * of.V.rightCols(1).col(0), of.U.rightCols(1).col(0)));
  }
  return shift;
}

// Q'M Q = [N X; 0 S]: N nilpotent (exact zeros on and below its diagonal blocks), S invertible.
struct Split {
  Matrix Q, M;
  Eigen::Index nilpotent = 0;
  int index = 0;
};

Split split(const Matrix& m, double tolerance) {
  const auto n = m.rows();
  Split out{Matrix::Identity(n, n), m, 0, 0};
  const double size = m.norm();
  while (out.nilpotent < n) {
    const auto from = out.nilpotent, left = n - from;
    const Svd of = svd(out.M.bottomRightCorner(left, left));
    const auto rank = (of.s.array() > tolerance * size).count();
    if (rank == left) break;
    Matrix turn(left, left);
    turn << of.V.rightCols(left - rank), of.V.leftCols(rank);
    out.M.rightCols(left) *= turn;
    out.M.bottomRows(left) = turn.transpose() * out.M.bottomRows(left);
    out.Q.rightCols(left) *= turn;
    out.M.block(from, from, left, left - rank).setZero();
    out.nilpotent += left - rank;
    ++out.index;
  }
  return out;
}

// r variables whose rows of V span it, those with derivatives before those without.
std::vector<Eigen::Index> variables_to_keep(const Matrix& v, const Matrix& E) {
  Matrix weighted = v.transpose();
  for (Eigen::Index i = 0; i < v.rows(); ++i)
    if (E.col(i).isZero(0.0)) weighted.col(i) *= 1e-3;
  std::vector<Eigen::Index> keep;
  if (v.cols() == 0) return keep;
  const Eigen::ColPivHouseholderQR<Matrix> qr(weighted);
  for (Eigen::Index k = 0; k < v.cols(); ++k) keep.push_back(qr.colsPermutation().indices()(k));
  std::sort(keep.begin(), keep.end());
  return keep;
}

std::string lost_digits(const char* what, double condition) {
  char text[160];
  std::snprintf(text, sizeof text, "%s is nearly singular (condition %.1e): its numbers keep few digits", what,
                condition);
  return condition > 1e10 ? text : "";
}

}  // namespace

Reduced reduce(const Matrix& E, const System& unchecked) {
  const System given = checked(unchecked);
  const auto n = given.order(), m = given.inputs();
  if (E.rows() != n || E.cols() != n)
    throw LinearError("E is " + std::to_string(E.rows()) + " x " + std::to_string(E.cols()) + ", but must be " +
                      std::to_string(n) + " x " + std::to_string(n) + " as A");
  if (!E.allFinite()) throw LinearError("E holds a number that is not finite");
  Reduced out{given, {}, 0, ""};
  if (n == 0 || E == Matrix::Identity(n, n)) return out;
  const Pencil p = scaled(E, given);
  const double tolerance = rank_tolerance(n, n), s0 = shift_for(p, given, tolerance);
  const double pace = p.E.norm() > 0.0 ? 1.0 / p.E.norm() : 1.0;
  const Eigen::FullPivLU<Matrix> regular(s0 * p.E - p.A);
  const Split parts = split(pace * regular.solve(p.E), tolerance);
  out.index = parts.index;
  if (parts.nilpotent == 0) {
    const Eigen::FullPivLU<Matrix> lu(p.E);
    out.system.A = p.column.asDiagonal() * lu.solve(p.A) * p.column.cwiseInverse().asDiagonal();
    out.system.B = p.column.asDiagonal() * lu.solve(p.B);
    out.warning = lost_digits("E", condition_number(p.E));
    return out;
  }

  // M x' = (s0 M - pace) x + g u in coordinates that leave the two parts uncoupled.
  const auto f = parts.nilpotent, r = n - f;
  const Matrix nil = parts.M.topLeftCorner(f, f), slow = parts.M.bottomRightCorner(r, r);
  const Matrix y = sylvester(nil, -slow, parts.M.topRightCorner(f, r));
  const Matrix g = parts.Q.transpose() * (pace * regular.solve(p.B));
  const Matrix g_slow = g.bottomRows(r), g_fast = g.topRows(f) - y * g_slow;
  const Matrix q_fast = p.column.asDiagonal() * parts.Q.leftCols(f);
  const Matrix v = parts.Q.leftCols(f) * y + parts.Q.rightCols(r);  // scaled variables of the part with dynamics

  // x = diag(column) v z + jump u + jumps of its derivatives
  const Eigen::FullPivLU<Matrix> at_once(pace * Matrix::Identity(f, f) - s0 * nil);
  Matrix follows = at_once.solve(g_fast);
  const Matrix jump = q_fast * follows;
  std::vector<Matrix> derivatives;
  for (int i = 1; i < parts.index; ++i) {
    follows = -at_once.solve(nil * follows);
    derivatives.push_back(q_fast * follows);
    refuse_improper(given, derivatives.back(), jump, i);
  }
  const auto keep = variables_to_keep(v, E);
  const Matrix turn = v(keep, Eigen::all);
  const Vector unit = p.column(keep);
  Matrix back(r, r), a(r, r), b(r, m);
  if (r > 0) {
    back = turn.fullPivLu().inverse();
    const Eigen::FullPivLU<Matrix> lu(slow);
    a = -pace * lu.inverse();
    a.diagonal().array() += s0;
    b = lu.solve(g_slow);
    out.warning = lost_digits("the part with dynamics", condition_number(slow) * condition_number(turn));
  }
  const Matrix all = p.column.asDiagonal() * v * back * unit.cwiseInverse().asDiagonal();  // x = all xi + jump u
  out.system.A = unit.asDiagonal() * turn * a * back * unit.cwiseInverse().asDiagonal();
  out.system.B = unit.asDiagonal() * turn * b;
  out.system.C = given.C * all;
  out.system.D = given.D + given.C * jump;
  tell(given, E, all, jump, derivatives, keep, &out);
  return out;
}

}  // namespace slipbench::linear
