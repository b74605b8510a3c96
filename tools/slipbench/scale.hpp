// A scale for values of any spread: straight from zero where it can be, by decades where the largest is more than 30 times the least.
#pragma once

#include <string>
#include <utility>
#include <vector>

#include "tools/slipbench/svg.hpp"

namespace slipbench {

class Scale {
 public:
  // Holds all finite values. Without any: 0 to 1, and `empty`.
  Scale(const std::vector<double>& values, double from_px, double to_px);
  [[nodiscard]] double at(double value) const;
  [[nodiscard]] double share(double value) const;  // 0 at the start, 1 at the end
  [[nodiscard]] const std::vector<std::pair<double, std::string>>& marks() const { return marks_; }
  [[nodiscard]] bool by_decades() const { return by_decades_; }
  [[nodiscard]] bool empty() const { return empty_; }
  [[nodiscard]] double from() const { return axis_.from_px; }
  [[nodiscard]] double to() const { return axis_.to_px; }

 private:
  svg::Axis axis_;
  bool by_decades_ = false, empty_ = false;
  std::vector<std::pair<double, std::string>> marks_;
};

}  // namespace slipbench
