#include <Eigen/Eigenvalues>
#include <cmath>
#include <cstdio>
#include <limits>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/gramians.hpp"
#include "plant/linear/minimal.hpp"
#include "plant/linear/poles.hpp"
#include "plant/linear/transfer.hpp"

namespace slipbench::linear {
namespace {

// F with F F' = W, W symmetric and positive semidefinite but for rounding.
Matrix factor(const Matrix& w) {
  const Eigen::SelfAdjointEigenSolver<Matrix> of(w);
  return of.eigenvectors() * of.eigenvalues().cwiseMax(0.0).cwiseSqrt().asDiagonal();
}

}  // namespace

Minimal balanced(const System& given) {
  if (const Verdict verdict = stability_of(given); verdict.stability != Stability::stable)
    throw LinearError("only a stable system has a balanced form: " + verdict.why);
  Minimal out = minimal(given);
  const auto n = out.system.order();
  if (n == 0) return out;
  // Units first, states only: Hankel values depend on the inputs' and outputs'.
  const Vector unit = in_balanced_units(out.system).state, inverse = unit.cwiseInverse();
  System s = out.system;
  s.A = inverse.asDiagonal() * s.A * unit.asDiagonal();
  s.B = inverse.asDiagonal() * s.B;
  s.C = s.C * unit.asDiagonal();
  const Gramians w = gramians(s);
  const Matrix reach = factor(w.controllability), see = factor(w.observability);
  const Svd of = svd(see.transpose() * reach);
  out.hankel = of.s;
  const double floor = static_cast<double>(n) * std::sqrt(std::numeric_limits<double>::epsilon()) * of.s(0);
  const auto r = (of.s.array() > floor).count();
  const Vector root = of.s.head(r).cwiseSqrt().cwiseInverse();
  const Matrix right = reach * of.V.leftCols(r) * root.asDiagonal();
  const Matrix left = root.asDiagonal() * of.U.leftCols(r).transpose() * see.transpose();
  for (Eigen::Index i = r; i < n; ++i) {
    char text[160];
    std::snprintf(text, sizeof text, ": Hankel singular value %.1e, lost in rounding beside %.1e", of.s(i), of.s(0));
    const Vector lies = unit.asDiagonal() * (reach * of.V.col(i));
    out.removed.push_back("a state along " + direction_text(given, out.R * lies) + text);
  }
  out.system.A = left * s.A * right;
  out.system.B = left * s.B;
  out.system.C = s.C * right;
  out.L = left * inverse.asDiagonal() * out.L;
  out.R = out.R * unit.asDiagonal() * right;
  out.system.state_names.clear();
  for (Eigen::Index k = 1; k <= r; ++k) out.system.state_names.push_back("b" + std::to_string(k));
  out.residual = transfer_difference(given, out.system);
  if (!w.warning.empty()) out.warning += (out.warning.empty() ? "" : "; ") + w.warning;
  return out;
}

}  // namespace slipbench::linear
