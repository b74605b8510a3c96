#include <Eigen/LU>
#include <algorithm>
#include <cstdio>

#include "plant/linear/balance.hpp"
#include "plant/linear/decomposition.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/staircase.hpp"

namespace slipbench::linear {
namespace {

void named(System* s, const char* kind, Eigen::Index count) {
  for (Eigen::Index i = 1; i <= count; ++i) s->state_names.push_back(kind + std::to_string(i));
}

// Writes zeros where theory has them; returns how large they were, relative.
double cleaned(KalmanForm* f) {
  System& s = f->system;
  const Eigen::Index size[] = {f->controllable_observable, f->controllable_only, f->observable_only, f->neither};
  Eigen::Index at[] = {0, size[0], size[0] + size[1], size[0] + size[1] + size[2]};
  static constexpr bool zero[4][4] = {{0, 1, 0, 1}, {0, 0, 0, 0}, {1, 1, 0, 1}, {1, 1, 0, 0}};
  double a = 0.0, b = 0.0, c = 0.0;
  const double size_a = s.A.norm(), size_b = s.B.norm(), size_c = s.C.norm();
  for (int i = 0; i < 4; ++i) {
    for (int j = 0; j < 4; ++j)
      if (auto block = s.A.block(at[i], at[j], size[i], size[j]); zero[i][j]) {
        a = std::max(a, block.norm());
        block.setZero();
      }
    if (auto rows = s.B.middleRows(at[i], size[i]); i >= 2) {
      b = std::max(b, rows.norm());
      rows.setZero();
    }
    if (auto columns = s.C.middleCols(at[i], size[i]); i % 2 == 1) {
      c = std::max(c, columns.norm());
      columns.setZero();
    }
  }
  return std::max({size_a > 0.0 ? a / size_a : 0.0, size_b > 0.0 ? b / size_b : 0.0, size_c > 0.0 ? c / size_c : 0.0});
}

}  // namespace

KalmanForm kalman_form(const System& given) {
  const BalancedUnits balanced = in_balanced_units(given);
  const System& s = balanced.system;
  const auto n = s.order();
  KalmanForm out;
  const auto reach = controllable_staircase(s.A, s.B), see = observable_staircase(s.A, s.C);
  out.tolerance = reach.tolerance;
  const Matrix reached = reach.T.leftCols(reach.rank), hidden = see.T.rightCols(n - see.rank);
  // Inside the reachable subspace: what can be seen, and what lies in the hidden subspace too.
  const auto inside = controllable_part((reached.transpose() * s.A * reached).transpose(), (s.C * reached).transpose(),
                                        out.tolerance, s.A.norm(), s.C.norm());
  const Matrix v1 = reached * inside.T.leftCols(inside.rank),
               v2 = reached * inside.T.rightCols(reach.rank - inside.rank);
  const auto both = std::min(v2.cols(), hidden.cols());
  const auto outside = std::min(hidden.cols() - both, n - reach.rank);
  // Hidden but not reachable: the hidden subspace less v2; seen but not reachable: what is at right angles to all others.
  const Matrix v4 = (hidden * svd(v2.transpose() * hidden).V).rightCols(outside);
  Matrix others(n, reach.rank + outside);
  others << v1, v2, v4;
  const Matrix v3 = svd(others).U.rightCols(n - reach.rank - outside);
  Matrix t(n, n);
  t << v1, v2, v3, v4;

  out.controllable_observable = v1.cols();
  out.controllable_only = v2.cols();
  out.observable_only = v3.cols();
  out.neither = v4.cols();
  out.condition = condition_number(t);
  out.unit = balanced.state;
  out.T = balanced.state.asDiagonal() * t;
  out.system = s;
  if (n > 0) {
    const Eigen::FullPivLU<Matrix> lu(t);
    out.system.A = lu.solve(s.A * t);
    out.system.B = lu.solve(s.B);
    out.system.C = s.C * t;
  }
  out.residual = cleaned(&out);
  out.system.B = out.system.B * balanced.input.cwiseInverse().asDiagonal();
  out.system.C = balanced.output.asDiagonal() * out.system.C;
  out.system.D = given.D;
  out.system.state_names.clear();
  named(&out.system, "co", v1.cols());
  named(&out.system, "c", v2.cols());
  named(&out.system, "o", v3.cols());
  named(&out.system, "n", v4.cols());

  out.warning = ranks_of(given).warning;
  if (v2.cols() > hidden.cols() || out.condition > 1e8 || out.residual > 1e-9) {
    char text[200];
    std::snprintf(
        text, sizeof text,
        "the reachable and the hidden subspace nearly meet (condition %.1e): the parts left out were not zero "
        "but %.1e of the whole",
        out.condition, out.residual);
    out.warning += (out.warning.empty() ? "" : "; ") + std::string(text);
  }
  return out;
}

}  // namespace slipbench::linear
