#include "plant/linear/gramians.hpp"

#include <algorithm>
#include <cstdio>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/lyapunov.hpp"
#include "plant/linear/poles.hpp"

namespace slipbench::linear {

Gramians gramians(const System& system) {
  if (const Verdict verdict = stability_of(system); verdict.stability != Stability::stable)
    throw LinearError("there is no Gramian of a system that is not stable: " + verdict.why);
  // Solved in balanced state units: in the given ones one large state would drown the others.
  const Vector state = in_balanced_units(system).state, inverse = state.cwiseInverse();
  const Matrix a = inverse.asDiagonal() * system.A * state.asDiagonal();
  const Matrix b = inverse.asDiagonal() * system.B, c = system.C * state.asDiagonal();
  const Matrix bb = b * b.transpose(), cc = c.transpose() * c;
  const bool discrete = system.discrete();
  const Matrix wc = discrete ? stein(a, bb) : lyapunov(a, bb);
  const Matrix wo = discrete ? stein(a.transpose(), cc) : lyapunov(a.transpose(), cc);
  Gramians out{state.asDiagonal() * wc * state.asDiagonal(), inverse.asDiagonal() * wo * inverse.asDiagonal(), 0.0, ""};
  const auto residual = discrete ? stein_residual : lyapunov_residual;
  out.residual = std::max(residual(a, wc, bb), residual(a.transpose(), wo, cc));
  // The equation's own magnification: the solution against what would answer at the pace of ||A||.
  const double pace = discrete ? 1.0 : 2.0 * a.norm();
  double gain = 0.0;
  for (const auto& [w, q] : {std::pair(&wc, &bb), std::pair(&wo, &cc)})
    if (q->norm() > 0.0) gain = std::max(gain, pace * w->norm() / q->norm());
  if (out.residual > 1e-12 || gain > 1e10) {
    char text[160];
    std::snprintf(
        text, sizeof text,
        "the Gramians are ill-conditioned (magnified %.1e times): relative error up to about %.0e, residual %.1e", gain,
        gain * 2.2e-16, out.residual);
    out.warning = text;
  }
  return out;
}

}  // namespace slipbench::linear
