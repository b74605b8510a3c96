// A quantity over time as straight lines between knots, held before the first and after the last.
//
// Equal times make a step. A plant step uses one line for all its stages, that of the step's middle, so that a jump on the
// grid of steps is integrated exactly and a stage never sees the value beyond it.
#pragma once

#include <array>
#include <cstddef>
#include <vector>

#include "plant/math/fields.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

// value(t) = value + slope (t - start).
template <class Real>
struct Line {
  Real value{}, slope{};
  double start = 0.0;
  SLIPBENCH_FIELDS(value, slope)

  [[nodiscard]] Real at(double t) const { return value + slope * Real(t - start); }
};

class Profile {
 public:
  Profile() = default;
  // Knots (time s, value), times not descending; values are multiplied by `factor`. Empty: `empty_value` throughout.
  Profile(std::vector<std::array<double, 2>> knots, double factor, double empty_value = 0.0)
      : knots_(std::move(knots)) {
    for (auto& knot : knots_) knot[1] *= factor;
    if (knots_.empty()) knots_.push_back({0.0, empty_value});
  }

  // The line that holds just after time t. Calls with rising t cost O(1).
  Line<double> line_at(double t) {
    while (next_ < knots_.size() && knots_[next_][0] <= t) ++next_;
    while (next_ > 0 && knots_[next_ - 1][0] > t) --next_;
    if (next_ == 0) return {knots_.front()[1], 0.0, 0.0};
    const auto& from = knots_[next_ - 1];
    if (next_ == knots_.size()) return {from[1], 0.0, 0.0};
    const auto& to = knots_[next_];
    return {from[1], (to[1] - from[1]) / (to[0] - from[0]), from[0]};
  }

 private:
  std::vector<std::array<double, 2>> knots_;
  std::size_t next_ = 0;  // first knot later than the last time asked for
};

}  // namespace slipbench
