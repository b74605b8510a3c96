// Poles and zeros in the s-plane or z-plane, on a grid of damping and frequency.
//
// s-plane: angle is true, so that rays are of one damping d = -cos(angle) and circles of one frequency |s|; the radius runs straight, or
// by decades where the poles spread over more than 30. z-plane: the unit circle, z = exp(s T) of the same grid.
#pragma once

#include <string>
#include <vector>

#include "plant/linear/system.hpp"

namespace slipbench {

struct MappedPole {
  linear::Complex at;
  bool controllable = true, observable = true;
};

struct PoleMap {
  double left = 0.0, top = 0.0, side = 300.0;  // px
  std::vector<MappedPole> poles;
  std::vector<linear::Complex> zeros;
  double sample_period_s = 0.0;  // 0: continuous
};

std::string pole_map(const PoleMap& map);

}  // namespace slipbench
