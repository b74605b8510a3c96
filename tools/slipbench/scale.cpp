#include "tools/slipbench/scale.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace slipbench {

namespace {

constexpr double much = 30.0;  // then the small ones would lie on the axis

std::vector<std::pair<double, std::string>> decade_marks(double low, double high) {
  std::vector<std::pair<double, std::string>> all, tens;
  for (double p = std::floor(std::log10(low)); p <= std::log10(high); p += 1.0) {
    for (const double lead : {1.0, 2.0, 5.0}) {
      const double value = lead * std::pow(10.0, p);
      if (value < low * (1.0 - 1e-9) || value > high * (1.0 + 1e-9)) continue;
      all.emplace_back(value, fmt::format("{:.6g}", value));
      if (lead == 1.0) tens.push_back(all.back());
    }
  }
  return all.size() > 8 ? tens : all;
}

}  // namespace

Scale::Scale(const std::vector<double>& values, double from_px, double to_px) : axis_{0.0, 1.0, from_px, to_px} {
  double low = std::numeric_limits<double>::infinity(), high = -low;
  for (const double value : values) {
    if (std::isfinite(value)) low = std::min(low, value), high = std::max(high, value);
  }
  empty_ = !(low <= high);
  if (empty_) return;
  by_decades_ = low > 0.0 && high > much * low;
  if (by_decades_) {
    low *= 0.9, high *= 1.1;
    axis_.low = std::log10(low), axis_.high = std::log10(high);
    marks_ = decade_marks(low, high);
    return;
  }
  low = std::min(low, 0.0), high = std::max(high, 0.0);
  if (!(high > low)) high = low + 1.0;
  const double room = 0.05 * (high - low);
  axis_.low = low < 0.0 ? low - room : 0.0, axis_.high = high > 0.0 ? high + room : 0.0;
  const svg::Ticks ticks = svg::ticks(axis_.low, axis_.high, 6);
  for (const double value : ticks.values) marks_.emplace_back(value, ticks.label(value));
}

double Scale::at(double value) const {
  return axis_.at(by_decades_ ? std::log10(std::max(value, std::numeric_limits<double>::min())) : value);
}

double Scale::share(double value) const {
  return std::clamp((at(value) - axis_.from_px) / (axis_.to_px - axis_.from_px), 0.0, 1.0);
}

}  // namespace slipbench
