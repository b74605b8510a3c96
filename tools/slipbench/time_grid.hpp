// How long, and how finely, a response is worth looking at: set by the modes that decay.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench {

struct TimeGrid {
  double step_s = 1.0;
  Eigen::Index steps = 1;
  [[nodiscard]] double duration_s() const { return step_s * static_cast<double>(steps); }
};

// Nine time constants of the slowest mode that decays (three periods of one that only swings), but six e-foldings at most of one that
// grows; the fastest mode resolved where 20000 steps allow. A discrete system is stepped at its period. A duration asked for is cut to 200
// e-foldings: beyond that nothing is left to see, and a double soon overflows.
TimeGrid grid_for(const linear::System& system);
TimeGrid grid_for(const linear::System& system, double duration_s);

// Frequencies in rad/s, by decades, from a tenth of the slowest mode to ten times the fastest, below Nyquist.
std::vector<double> frequencies_for(const linear::System& system, std::size_t count);

}  // namespace slipbench
