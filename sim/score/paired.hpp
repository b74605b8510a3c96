// Confidence over N noise runs: Student-t intervals of a mean and of the mean paired difference.
//
//   mean +- t(1 - (1 - c)/2, n - 1) s / sqrt(n),   s^2 = sum (x - mean)^2 / (n - 1)
//
// c: confidence, two-sided (0.95). A pair is two figures of the same run, so that noise common to both cancels.
// Source: "Student" (W.S. Gosset), "The probable error of a mean", Biometrika 6(1), 1908; any text on statistics.
#pragma once

#include <optional>
#include <span>

#include "sim/score/figures.hpp"

namespace slipbench {

struct Interval {
  std::size_t runs = 0;  // that had a number
  Figure mean;           // empty: no run had one
  Figure low, high;      // empty: fewer than two
  [[nodiscard]] bool excludes_zero() const { return low && high && (*low > 0.0 || *high < 0.0); }
};

// Quantile of Student's t distribution: P(T <= t) = probability, 0 < probability < 1, degrees of freedom >= 1.
double student_quantile(double probability, double degrees_of_freedom);

// Runs without a number are left out.
Interval mean_interval(std::span<const Figure> values, double confidence = 0.95);
// Of a - b, over the runs in which both exist. The spans have the same length.
Interval paired_difference(std::span<const Figure> a, std::span<const Figure> b, double confidence = 0.95);

}  // namespace slipbench
