#include "plant/linear/staircase.hpp"

#include <algorithm>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"

namespace slipbench::linear {

Staircase controllable_part(const Matrix& A, const Matrix& B, double tolerance, double size_a, double size_b) {
  const auto n = A.rows();
  Staircase out;
  out.T = Matrix::Identity(n, n);
  out.tolerance = tolerance;
  Matrix a = A, step = B;
  double size = size_b;
  while (out.rank < n && step.size() > 0) {
    // The rows of `step` still to be reached; its range joins the subspace, its left null space is left over.
    const Svd of = svd(step);
    const auto rank = size > 0.0 ? (of.s.array() > out.tolerance * size).count() : 0;
    if (size > 0.0) {
      if (rank > 0) out.smallest_kept = std::min(out.smallest_kept, of.s(rank - 1) / size);
      if (rank < of.s.size()) out.largest_dropped = std::max(out.largest_dropped, of.s(rank) / size);
    }
    if (rank == 0) break;
    const auto from = out.rank, left = n - from;
    out.T.rightCols(left) *= of.U;
    a.bottomRows(left) = of.U.transpose() * a.bottomRows(left);
    a.rightCols(left) *= of.U;
    out.rank += rank;
    out.blocks.push_back(rank);
    step = a.block(out.rank, from, n - out.rank, rank);
    size = size_a;
  }
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
