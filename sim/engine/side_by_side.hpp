// Structs of double, one a lane, side by side in one struct of packs, and apart again. For double itself: a copy. Numbers go
// in the order of each_number; what is no number stays as it is. Allocates: outside the tick only.
#pragma once

#include "sim/engine/setup.hpp"

namespace slipbench {

// `get(setup)` gives the struct, or the flat list of numbers, of one lane.
template <class Real, class To, class Get>
void side_by_side(To& to, Cases cases, Get get) {
  const auto targets = numbers_of<Real>(to);
  for (std::size_t lane = 0; lane < width_of<Real>; ++lane) {
    const auto& from = get(*cases[lane]);
    if constexpr (std::is_same_v<decltype(from), const std::vector<double>&>) {
      for (std::size_t i = 0; i < targets.size(); ++i) set_lane(*targets[i], lane, from[i]);
    } else {
      const auto sources = numbers_of<const double>(from);
      for (std::size_t i = 0; i < targets.size(); ++i) set_lane(*targets[i], lane, *sources[i]);
    }
  }
}

// One lane's numbers, flat.
template <class Real, class From>
void apart(const From& from, std::size_t lane, std::vector<double>& to) {
  to.clear();
  each_number(from, [&](const Real& x) { to.push_back(lane_of(x, lane)); });
}
// The same into a struct of double.
template <class Real, class From, class To>
void apart(const From& from, std::size_t lane, To& to) {
  std::vector<double> flat;
  apart<Real>(from, lane, flat);
  std::size_t at = 0;
  each_number(to, [&](double& x) { x = flat[at++]; });
}

template <class Real, class Get>
Real number_of(Cases cases, Get get) {
  Real x{};
  for (std::size_t lane = 0; lane < width_of<Real>; ++lane) set_lane(x, lane, get(*cases[lane]));
  return x;
}

}  // namespace slipbench
