// Numbers scheduled over a variable: straight lines between a few points, held beyond the ends; continuous.
//
//   y(x) = y_0 + sum_n slope_n clamp(x - x_n, 0, x_(n+1) - x_n)
//
// The table's size is fixed, so that a schedule is plain data in every number type; a shorter table leaves segments of no
// width. `make_schedule` wants 1 to schedule_points rising x (std::invalid_argument).
#pragma once

#include <array>
#include <cstddef>
#include <stdexcept>
#include <string>
#include <vector>

#include "plant/math/fields.hpp"
#include "plant/math/labels.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

inline constexpr std::size_t schedule_points = 7;

template <class Real, std::size_t N>
struct Schedule {
  std::array<Real, schedule_points - 1> from{}, width{};
  std::array<Real, N> first{};
  std::array<std::array<Real, N>, schedule_points - 1> slope{};
  SLIPBENCH_FIELDS(from, width, first, slope)
};

template <class Real, std::size_t N>
std::array<Real, N> at(const Schedule<Real, N>& s, const Real& x) {
  std::array<Real, N> y = s.first;
  for (std::size_t n = 0; n + 1 < schedule_points; ++n) {
    const Real along = clamp(x - s.from[n], Real(0.0), s.width[n]);
    SLIPBENCH_LABEL(along)
    for (std::size_t i = 0; i < N; ++i) y[i] = y[i] + along * s.slope[n][i];
  }
  return y;
}

template <std::size_t N>
Schedule<double, N> make_schedule(const std::vector<double>& x, const std::vector<std::array<double, N>>& y) {
  if (x.empty() || x.size() > schedule_points || x.size() != y.size())
    throw std::invalid_argument("a schedule has 1 to " + std::to_string(schedule_points) + " points, here " +
                                std::to_string(x.size()));
  Schedule<double, N> s;
  s.first = y.front();
  for (std::size_t n = 0; n + 1 < schedule_points; ++n) {
    s.from[n] = x[n + 1 < x.size() ? n : x.size() - 1];
    if (n + 1 >= x.size()) continue;
    s.width[n] = x[n + 1] - x[n];
    if (!(s.width[n] > 0.0)) throw std::invalid_argument("the points of a schedule must rise");
    for (std::size_t i = 0; i < N; ++i) s.slope[n][i] = (y[n + 1][i] - y[n][i]) / s.width[n];
  }
  return s;
}

}  // namespace slipbench
