// Sums of a stream of points, kept in groups of neighbours, and the bootstrap over those groups: what can be reckoned from sums gets a
// standard error, in memory that does not grow with the number of points.
//
// Up to `most_groups` points each is a group of its own, the bootstrap as it is usually meant. A resample draws as many groups as
// there are, with replacement, by counter: the same seed draws the same.
// Source: B. Efron, "Bootstrap methods: another look at the jackknife", Ann. Stat. 7(1), 1979, 1-26.
#pragma once

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <limits>
#include <vector>

#include "sim/engine/noise.hpp"

namespace slipbench {

class GroupSums {
 public:
  static constexpr std::uint32_t resamples = 1000;  // an error of 2 % in a standard error; so have 1024 groups
  static constexpr std::size_t most_groups = 1024, least_groups = 64;
  static constexpr std::size_t most_sums = std::size_t{1}
                                           << 18;  // of all groups together, while the least are there: 2 MB

  // The first of the sums counts points: groups without any are not drawn.
  GroupSums(std::uint64_t points, std::size_t sums)
      : points_(points),
        groups_(std::min<std::uint64_t>(points, std::clamp(most_sums / sums, least_groups, most_groups))),
        sums_(sums),
        at_(groups_ * sums, 0.0) {}

  // The sums that point i adds to.
  [[nodiscard]] double* of(std::uint64_t i) {
    const auto share = static_cast<long double>(i) / static_cast<long double>(points_);
    const auto group = static_cast<std::size_t>(share * static_cast<long double>(groups_));
    return at_.data() + std::min(group, groups_ - 1) * sums_;
  }

  [[nodiscard]] std::vector<double> total() const {
    std::vector<double> all(sums_, 0.0);
    for (std::size_t i = 0; i < at_.size(); ++i) all[i % sums_] += at_[i];
    return all;
  }

  // Calls f(sums) for each resample.
  template <class F>
  void each_resample(std::uint64_t seed, F&& f) const {
    constexpr std::uint32_t use = 0x53454E53u;  // tells these words from those of draws and noise
    std::vector<const double*> filled;
    for (std::size_t g = 0; g < groups_; ++g) {
      if (at_[g * sums_] > 0.0) filled.push_back(at_.data() + g * sums_);
    }
    std::vector<std::uint32_t> times(filled.size());
    std::vector<double> sums(sums_);
    for (std::uint32_t r = 0; r < resamples; ++r) {
      std::fill(times.begin(), times.end(), 0u);
      PhiloxBlock words{};
      for (std::size_t i = 0; i < filled.size(); ++i) {
        if (i % 4 == 0)
          words = philox4x32_10({static_cast<std::uint32_t>(i / 4), 0, r, use},
                                {static_cast<std::uint32_t>(seed), static_cast<std::uint32_t>(seed >> 32)});
        ++times[static_cast<std::size_t>(std::uint64_t{words[i % 4]} * filled.size() >> 32)];
      }
      std::fill(sums.begin(), sums.end(), 0.0);
      for (std::size_t g = 0; g < filled.size(); ++g) {
        const double n = times[g];
        if (times[g] == 0) continue;
        for (std::size_t s = 0; s < sums_; ++s) sums[s] += n * filled[g][s];
      }
      f(sums);
    }
  }

 private:
  std::uint64_t points_;
  std::size_t groups_, sums_;
  std::vector<double> at_;
};

// Standard error of one number over the resamples, those left out in which it does not exist.
class ResampleSpread {
 public:
  explicit ResampleSpread(double estimate) : estimate_(estimate) {}
  void take(double value) {
    if (!std::isfinite(value)) return;
    const double off = value - estimate_;
    ++count_, sum_ += off, squares_ += off * off;
  }
  [[nodiscard]] double standard_error() const {
    if (count_ < 2) return std::numeric_limits<double>::quiet_NaN();
    const double n = count_;
    return std::sqrt(std::max(squares_ - sum_ * sum_ / n, 0.0) / (n - 1.0));
  }

 private:
  double estimate_, sum_ = 0.0, squares_ = 0.0;
  std::uint32_t count_ = 0;
};

}  // namespace slipbench
