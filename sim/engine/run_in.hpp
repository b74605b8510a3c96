// The run-in of a steady start: from the first tick up to t = 0, told to nobody.
#pragma once

#include "sim/engine/drive_loop.hpp"

namespace slipbench {

// How much each drive still moves at the end, as a share of its ratings: means over the last quarter of the run-in against
// those over the quarter before, a tick of it. Infinite in a lane that diverged.
template <class Real>
Real run_in(DriveLoop<Real>& loop, const PlantNumbers<Real>& plant) {
  const RunShape& shape = loop.shape();
  const std::int64_t first = shape.first_tick, window = first < -4 ? -first / 4 : 1;
  std::array<std::vector<Real>, 2> means;
  for (auto& m : means) m.assign(3 + 2 * loop.estimator_count(), Real(0.0));
  Real moving(0.0);
  const Real infinity(std::numeric_limits<double>::infinity());
  std::array<Lost, width_of<Real>> lost{};
  for (std::int64_t k = first; k < 0; ++k) {
    loop.disturb(k);
    loop.sense(k);
    loop.estimate();
    loop.control(k);
    if (loop.find_lost(moving < infinity, lost)) {
      bool all = true;
      for (std::size_t lane = 0; lane < lost.size(); ++lane) {
        if (lost[lane] != Lost::nothing) set_lane(moving, lane, lane_of(infinity, lane));
        all = all && !lane_of(moving < infinity, lane);
      }
      if (all) return moving;
    }
    if (k >= -2 * window) {
      auto& m = means[k >= -window ? 1 : 0];
      const PlantRowOf<Real> row = loop.row(k * shape.steps_per_control);
      m[0] = m[0] + row[P::speed_rpm] * Real(rad_s_in_rpm) * plant.per_speed;
      m[1] = m[1] + row[P::rotor_flux] * plant.per_flux;
      m[2] = m[2] + row[P::torque] / plant.rated_torque;
      for (std::size_t i = 0; i < loop.estimator_count(); ++i) {
        m[3 + 2 * i] = m[3 + 2 * i] + loop.estimates()[i].speed * plant.per_speed;
        m[4 + 2 * i] = m[4 + 2 * i] + loop.estimates()[i].rotor_flux * plant.per_flux;
      }
    }
    for (std::int64_t n = k * shape.steps_per_control; n < (k + 1) * shape.steps_per_control; ++n) loop.plant_step(n);
  }
  for (std::size_t i = 0; i < means[0].size(); ++i)
    moving = max(moving, fabs(means[1][i] - means[0][i]) / Real(static_cast<double>(window)));
  return moving;
}

}  // namespace slipbench
