// A signal of any length kept as its least, greatest and mean value in each of a fixed number of columns, so that a drawing
// of it shows every peak and costs the same for a second and for an hour. Values that are not finite leave a gap.
#pragma once

#include <cmath>
#include <limits>
#include <vector>

namespace slipbench {

class Envelope {
 public:
  struct Bin {
    double low = std::numeric_limits<double>::infinity(), high = -low;
    double sum = 0.0, count = 0.0;
    [[nodiscard]] bool empty() const { return count == 0.0; }
    [[nodiscard]] double mean() const { return sum / count; }
  };

  explicit Envelope(std::size_t columns = 0) : bins_(columns) {}

  void add(std::size_t column, double value) {
    if (column >= bins_.size() || !std::isfinite(value)) return;
    Bin& bin = bins_[column];
    if (value < bin.low) bin.low = value;
    if (value > bin.high) bin.high = value;
    bin.sum += value, bin.count += 1.0;
  }
  [[nodiscard]] const std::vector<Bin>& bins() const { return bins_; }

 private:
  std::vector<Bin> bins_;
};

}  // namespace slipbench
