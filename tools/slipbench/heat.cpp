#include "tools/slipbench/heat.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "tools/slipbench/svg.hpp"

namespace slipbench {

namespace {

constexpr std::string_view none_fill = "#d9d9d9";
constexpr std::array<std::array<double, 3>, 5> blues = {
    {{240, 246, 250}, {173, 207, 228}, {93, 157, 200}, {18, 100, 160}, {6, 38, 74}}};

}  // namespace

std::string heat(double share) {
  const double at = std::clamp(share, 0.0, 1.0) * static_cast<double>(blues.size() - 1);
  const std::size_t i = std::min(static_cast<std::size_t>(at), blues.size() - 2);
  const double t = at - static_cast<double>(i);
  std::array<int, 3> c{};
  for (std::size_t k = 0; k < 3; ++k)
    c[k] = static_cast<int>(std::lround(blues[i][k] + t * (blues[i + 1][k] - blues[i][k])));
  return fmt::format("#{:02x}{:02x}{:02x}", c[0], c[1], c[2]);
}

std::string crossed_cell(double x, double y, double w, double h) {
  return svg::rectangle(x, y, w, h, none_fill) + svg::line(x + 2, y + 2, x + w - 2, y + h - 2, svg::frame) +
         svg::line(x + 2, y + h - 2, x + w - 2, y + 2, svg::frame);
}

}  // namespace slipbench
