// A quantity over time as straight lines between knots, held before the first and after the last.
//
// Equal times make a step. A plant step uses one line for all its stages, that of the step's middle, so that a jump on the
// grid of steps is integrated exactly and a stage never sees the value beyond it.
#pragma once

#include <array>
#include <cstddef>
#include <limits>
#include <vector>

#include "plant/math/fields.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

// value(t) = value + slope (t - start).
template <class Real>
struct Line {
  Real value{}, slope{}, start{};
  SLIPBENCH_FIELDS(value, slope, start)

  [[nodiscard]] Real at(double t) const { return value + slope * (Real(t) - start); }
};

// A line and the times over which it holds, the first in, the last out.
struct Stretch {
  Line<double> line;
  double from = -std::numeric_limits<double>::infinity(), until = std::numeric_limits<double>::infinity();
};

class Profile {
 public:
  Profile() : Profile({}, 1.0) {}
  // Knots (time s, value), times not descending; values are multiplied by `factor`. Empty: `empty_value` throughout.
  Profile(const std::vector<std::array<double, 2>>& knots, double factor, double empty_value = 0.0) {
    lines_.push_back({knots.empty() ? empty_value : factor * knots.front()[1], 0.0, 0.0});
    for (std::size_t i = 0; i < knots.size(); ++i) {
      const double value = factor * knots[i][1];
      Line<double> line{value, 0.0, knots[i][0]};
      if (i + 1 < knots.size() && knots[i + 1][0] > knots[i][0])
        line.slope = (factor * knots[i + 1][1] - value) / (knots[i + 1][0] - knots[i][0]);
      starts_.push_back(knots[i][0]);
      lines_.push_back(line);
    }
  }

  // The line that holds just after time t. Calls with rising t cost O(1).
  const Line<double>& line_at(double t) {
    while (now_ < starts_.size() && starts_[now_] <= t) ++now_;
    while (now_ > 0 && starts_[now_ - 1] > t) --now_;
    return lines_[now_];
  }
  Stretch stretch_at(double t) {
    Stretch stretch;
    stretch.line = line_at(t);
    if (now_ > 0) stretch.from = starts_[now_ - 1];
    if (now_ < starts_.size()) stretch.until = starts_[now_];
    return stretch;
  }

 private:
  std::vector<double> starts_;  // of lines_[1], lines_[2], ...; lines_[0] holds before the first knot
  std::vector<Line<double>> lines_;
  std::size_t now_ = 0;
};

}  // namespace slipbench
