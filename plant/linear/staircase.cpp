#include "plant/linear/staircase.hpp"

#include <algorithm>
#include <limits>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/lyapunov.hpp"

namespace slipbench::linear {
namespace {

// Rounding that has grown is believed up to here only: a coupling of more than 1e-8 of ||A|| is one.
constexpr double weakest_step = 1e-8;

// How much of A and B a T with that rank leaves where zeros belong.
double left_over(const Matrix& t, Eigen::Index rank, const Matrix& A, const Matrix& B, double size_a, double size_b) {
  const auto left = A.rows() - rank;
  const Matrix a = t.rightCols(left).transpose() * A * t.leftCols(rank), b = t.rightCols(left).transpose() * B;
  return (size_a > 0.0 ? a.norm() / size_a : 0.0) + (size_b > 0.0 ? b.norm() / size_b : 0.0);
}

// One Newton step on the invariant subspace that weak steps left inexact: T1 + T2 X with A22 X - X A11 + A21 = 0. Kept when
// it leaves less.
void refine(Staircase* s, const Matrix& A, const Matrix& B, double size_a, double size_b) {
  const auto n = A.rows(), rank = s->rank, left = n - rank;
  if (rank == 0 || left == 0 || s->largest_dropped <= 64.0 * std::numeric_limits<double>::epsilon()) return;
  const Matrix t1 = s->T.leftCols(rank), t2 = s->T.rightCols(left);
  try {
    const Matrix x = sylvester(t2.transpose() * A * t2, -(t1.transpose() * A * t1), t2.transpose() * A * t1);
    const Matrix first = t1 + t2 * x, second = t2 - t1 * x.transpose();
    Matrix t(n, n);
    t << first * svd(first).V * svd(first).s.cwiseInverse().asDiagonal() * svd(first).V.transpose(),
        second * svd(second).V * svd(second).s.cwiseInverse().asDiagonal() * svd(second).V.transpose();
    if (left_over(t, rank, A, B, size_a, size_b) < left_over(s->T, rank, A, B, size_a, size_b)) s->T = t;
  } catch (const LinearError&) {
    return;  // the two parts share a pole: no single step
  }
}

}  // namespace

Staircase controllable_part(const Matrix& A, const Matrix& B, double tolerance, double size_a, double size_b) {
  const auto n = A.rows();
  Staircase out;
  out.T = Matrix::Identity(n, n);
  out.tolerance = tolerance;
  Matrix a = A, step = B;
  double size = size_b, grown = 64.0 * static_cast<double>(n) * std::numeric_limits<double>::epsilon();
  while (out.rank < n && step.size() > 0) {
    // The rows of `step` still to be reached; its range joins the subspace, its left null space is left over.
    const Svd of = svd(step);
    // A weak step leaves its directions uncertain, and the steps after it inherit that.
    out.tolerance = std::max(tolerance, std::min(grown, weakest_step));
    const auto rank = size > 0.0 ? (of.s.array() > out.tolerance * size).count() : 0;
    if (size > 0.0) {
      if (rank > 0) out.smallest_kept = std::min(out.smallest_kept, of.s(rank - 1) / size);
      if (rank < of.s.size()) out.largest_dropped = std::max(out.largest_dropped, of.s(rank) / size);
    }
    if (rank == 0) break;
    grown *= size / of.s(rank - 1);
    const auto from = out.rank, left = n - from;
    out.T.rightCols(left) *= of.U;
    a.bottomRows(left) = of.U.transpose() * a.bottomRows(left);
    a.rightCols(left) *= of.U;
    out.rank += rank;
    out.blocks.push_back(rank);
    step = a.block(out.rank, from, n - out.rank, rank);
    size = size_a;
  }
  refine(&out, A, B, size_a, size_b);
  return out;
}

Staircase controllable_staircase(const Matrix& A, const Matrix& B, double tolerance) {
  const auto n = A.rows();
  return controllable_part(A, B, tolerance > 0.0 ? tolerance : rank_tolerance(n, n), A.norm(), B.norm());
}

Staircase observable_staircase(const Matrix& A, const Matrix& C, double tolerance) {
  return controllable_staircase(A.transpose(), C.transpose(), tolerance);
}

Ranks ranks_of(const System& system) {
  const System s = in_balanced_units(system).system;
  const auto c = controllable_staircase(s.A, s.B), o = observable_staircase(s.A, s.C);
  Ranks ranks{c.rank, o.rank, c.tolerance, ""};
  const auto warn = [&](const char* what, Eigen::Index balanced, Eigen::Index given) {
    if (balanced == given) return;
    ranks.warning += (ranks.warning.empty() ? "" : "; ") + std::string(what) + " rank " + std::to_string(balanced) +
                     " in balanced units but " + std::to_string(given) +
                     " in the given ones: some entries are so much smaller than others that they may be rounding";
  };
  warn("controllable", c.rank, controllable_staircase(system.A, system.B).rank);
  warn("observable", o.rank, observable_staircase(system.A, system.C).rank);
  return ranks;
}

}  // namespace slipbench::linear
