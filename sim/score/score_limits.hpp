// The score window and limits of one run (double), or of a pack of runs side by side, as the tallies ask for them.
//
// Limits of speed in rpm, times in s. Lanes may have windows of their own.
#pragma once

#include <span>

#include "plant/math/numbers.hpp"
#include "sim/score/basis.hpp"

namespace slipbench {

// What the lanes of a pack are scored by, in order; of one run alone: one.
using Bases = std::span<const ScoreBasis* const>;

template <class Real, class Get>
Real each_basis(Bases bases, Get get) {
  Real x{};
  for (std::size_t lane = 0; lane < width_of<Real>; ++lane) set_lane(x, lane, get(*bases[lane]));
  return x;
}

template <class Real>
struct ScoreLimits {
  Real from_s{}, to_s{}, lost_for_s{};  // with the slack of a tick's share
  Real lost_rpm{}, settled_rpm{}, least_flux_Wb{};
  double slack_s = 0.0;

  ScoreLimits() = default;
  explicit ScoreLimits(Bases bases) : slack_s(1e-6 * bases[0]->control_period_s) {
    const auto each = [&](auto get) { return each_basis<Real>(bases, get); };
    from_s = each([&](const ScoreBasis& b) { return b.window.from_s - slack_s; });
    to_s = each([&](const ScoreBasis& b) { return b.window.to_s + slack_s; });
    lost_for_s = each([&](const ScoreBasis& b) { return b.lost_for_s - slack_s; });
    lost_rpm = each([](const ScoreBasis& b) { return b.lost_error * b.rated_speed_rpm; });
    settled_rpm = each([](const ScoreBasis& b) { return b.settled_error * b.rated_speed_rpm; });
    least_flux_Wb = each([](const ScoreBasis& b) { return 0.1 * b.rated_rotor_flux_Wb; });
  }
  [[nodiscard]] MaskOf<Real> in_window(double time_s) const {
    const Real t(time_s);
    return (from_s <= t) & (t <= to_s);
  }
};

}  // namespace slipbench
