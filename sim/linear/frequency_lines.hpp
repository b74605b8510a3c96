// Lines of one stator frequency across the torque-speed plane: where speed is lost, and the band about it.
//
//   lost    w_r = -(2/3) R_r T / (p psi_r^2): stator frequency zero
//   blind   stator frequency -f and +f
#pragma once

#include <vector>

#include "sim/linear/flux_rule.hpp"
#include "sim/linear/plane.hpp"

namespace slipbench {

struct FrequencyLines {
  double blind_below_Hz = 0.0;
  std::vector<PlanePoint> lost, blind_from, blind_to;  // one a torque of the plane
};

// Throws InputError for a frequency that is not positive.
FrequencyLines frequency_lines(const Plane& plane, const FluxRule& flux, double blind_below_Hz);

}  // namespace slipbench
