#include "tools/slipbench/time_grid.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

#include "plant/linear/frequency_response.hpp"
#include "plant/linear/poles.hpp"

namespace slipbench {

namespace {

constexpr double pi = 3.14159265358979323846;
constexpr Eigen::Index most_steps = 20000, fewest_steps = 400;

}  // namespace

TimeGrid grid_for(const linear::System& s) {
  const auto modes = linear::modes_of(s);
  const double edge = linear::stability_of(s).tolerance;
  double slowest = 0.0, other = 0.0, growing = std::numeric_limits<double>::infinity();
  for (const linear::Mode& m : modes) {
    const double beyond = s.discrete() ? std::abs(m.pole) - 1.0 : m.pole.real();
    if (beyond < -edge && std::isfinite(m.time_constant_s))
      slowest = std::max(slowest, 9.0 * m.time_constant_s);
    else if (beyond > edge)
      growing = std::min(growing, std::fabs(m.time_constant_s));
    else if (m.frequency_rad_s > 0.0 && std::isfinite(m.frequency_rad_s))
      other = std::max(other, 3.0 * 2.0 * pi / m.frequency_rad_s);
  }
  const double fallback = s.discrete() ? 20.0 * s.sample_period_s : 1.0;
  const double wanted = slowest > 0.0            ? slowest
                        : other > 0.0            ? other
                        : std::isfinite(growing) ? 6.0 * growing
                                                 : fallback;
  return grid_for(s, std::min(wanted, 6.0 * growing));
}

TimeGrid grid_for(const linear::System& s, double duration_s) {
  for (const linear::Mode& m : linear::modes_of(s)) {
    if (m.time_constant_s < 0.0) duration_s = std::min(duration_s, -200.0 * m.time_constant_s);
  }
  if (s.discrete()) {
    const double steps = std::ceil(duration_s / s.sample_period_s);
    return {s.sample_period_s,
            std::clamp(static_cast<Eigen::Index>(std::min(steps, 1e6)), Eigen::Index{2}, most_steps)};
  }
  double fastest = 0.0;
  for (const linear::Mode& m : linear::modes_of(s)) {
    if (std::isfinite(m.frequency_rad_s)) fastest = std::max(fastest, m.frequency_rad_s);
  }
  const double wanted = std::min(duration_s * fastest * 10.0, 1e9);
  const Eigen::Index steps = std::clamp(static_cast<Eigen::Index>(wanted), fewest_steps, most_steps);
  return {duration_s / static_cast<double>(steps), steps};
}

std::vector<double> frequencies_for(const linear::System& s, std::size_t count) {
  double low = std::numeric_limits<double>::infinity(), high = 0.0;
  for (const linear::Mode& m : linear::modes_of(s)) {
    if (!std::isfinite(m.frequency_rad_s) || m.frequency_rad_s <= 0.0) continue;
    low = std::min(low, m.frequency_rad_s), high = std::max(high, m.frequency_rad_s);
  }
  const double nyquist = s.discrete() ? pi / s.sample_period_s : std::numeric_limits<double>::infinity();
  if (!(high > 0.0)) low = s.discrete() ? 1e-2 * nyquist : 1.0, high = low;
  low = std::min(low / 10.0, nyquist / 100.0), high = std::min(high * 10.0, nyquist);
  low = std::max(low, 1e-8 * high);
  return linear::logarithmic(low, high, count);
}

}  // namespace slipbench
