#include <cmath>
#include <cstdio>

#include "plant/linear/dense.hpp"
#include "plant/linear/poles.hpp"

namespace slipbench::linear {
namespace {

std::string number(double x) {
  char text[32];
  std::snprintf(text, sizeof text, "%.4g", x);
  return text;
}

std::string pole_text(Complex p) { return "pole " + text_of(p); }

std::string with_pair(Complex p) { return p.imag() != 0.0 ? pole_text(p) + " and its conjugate" : pole_text(p); }

}  // namespace

const char* name_of(Stability stability) {
  switch (stability) {
    case Stability::stable:
      return "stable";
    case Stability::marginal:
      return "marginal";
    default:
      return "unstable";
  }
}

Verdict stability_of(const System& system) {
  const auto groups = pole_groups(system.A);
  if (groups.empty()) return {Stability::stable, "no states: the outputs follow the inputs at once", 0.0};
  const bool discrete = system.discrete();
  const std::string border = discrete ? "unit circle" : "imaginary axis";
  const auto beyond = [&](const PoleGroup& g) { return discrete ? magnitude(g.pole) - 1.0 : g.pole.real(); };
  const PoleGroup *worst = nullptr, *jordan = nullptr, *marginal = nullptr, *slowest = nullptr;
  for (const PoleGroup& g : groups) {
    const double tolerance = 64.0 * g.uncertainty, at = beyond(g);
    if (at > tolerance && (!worst || at > beyond(*worst))) worst = &g;
    if (std::fabs(at) <= tolerance) {
      if (g.eigenvectors < g.count && !jordan) jordan = &g;
      if (!marginal) marginal = &g;
    }
    if (!slowest || at > beyond(*slowest)) slowest = &g;
  }
  const PoleGroup& decides = worst ? *worst : jordan ? *jordan : marginal ? *marginal : *slowest;
  const Mode mode = mode_of(decides.pole, system.sample_period_s);
  Verdict verdict{Stability::stable, "", 64.0 * decides.uncertainty};
  const std::string within = " (within " + number(verdict.tolerance) + ")";
  if (worst) {
    verdict.stability = Stability::unstable;
    verdict.why = with_pair(decides.pole) + (discrete ? " outside the unit circle" : " right of the imaginary axis") +
                  ": it grows e-fold every " + number(-mode.time_constant_s) + " s";
  } else if (jordan) {
    verdict.stability = Stability::unstable;
    verdict.why = with_pair(decides.pole) + " on the " + border + within + ", " + std::to_string(decides.count) +
                  " times over with " + std::to_string(decides.eigenvectors) +
                  (decides.eigenvectors == 1 ? " eigenvector" : " eigenvectors") +
                  " (a Jordan block): it grows with time";
  } else if (marginal) {
    verdict.stability = Stability::marginal;
    verdict.why =
        with_pair(decides.pole) + " on the " + border + within + ", no Jordan block: it neither dies nor grows";
  } else {
    verdict.why = with_pair(decides.pole) + " is the slowest: time constant " + number(mode.time_constant_s) + " s";
  }
  return verdict;
}

}  // namespace slipbench::linear
