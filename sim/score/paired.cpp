#include "sim/score/paired.hpp"

#include <boost/math/distributions/students_t.hpp>
#include <cmath>
#include <vector>

namespace slipbench {

double student_quantile(double probability, double degrees_of_freedom) {
  return boost::math::quantile(boost::math::students_t(degrees_of_freedom), probability);
}

Interval mean_interval(std::span<const Figure> values, double confidence) {
  Interval result;
  double sum = 0.0;
  for (const Figure& value : values) {
    if (value) ++result.runs, sum += *value;
  }
  if (result.runs == 0) return result;
  const double n = static_cast<double>(result.runs), mean = sum / n;
  result.mean = mean;
  if (result.runs < 2) return result;
  double square = 0.0;
  for (const Figure& value : values) {
    if (value) square += (*value - mean) * (*value - mean);
  }
  const double half = student_quantile(0.5 + 0.5 * confidence, n - 1.0) * std::sqrt(square / (n - 1.0) / n);
  result.low = mean - half;
  result.high = mean + half;
  return result;
}

Interval paired_difference(std::span<const Figure> a, std::span<const Figure> b, double confidence) {
  std::vector<Figure> differences;
  for (std::size_t i = 0; i < a.size() && i < b.size(); ++i) {
    differences.push_back(a[i] && b[i] ? Figure(*a[i] - *b[i]) : Figure());
  }
  return mean_interval(differences, confidence);
}

}  // namespace slipbench
