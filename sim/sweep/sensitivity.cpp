#include "sim/sweep/sensitivity.hpp"

#include <algorithm>
#include <cmath>

namespace slipbench {

namespace {

constexpr double nan = std::numeric_limits<double>::quiet_NaN();
// The first of the sums of either kind: points, sum y, sum y^2 of the outputs less the shift.
enum Sum : std::size_t { count, outputs, squares, of_keys };

double variance_of(const double* s, double n) {
  const double mean = s[outputs] / n;
  return s[squares] / n - mean * mean;
}

// An output that varies by less than 1e-12 of itself varies by rounding alone.
bool varies(double variance, double shift, double mean) {
  const double least = 1e-12 * std::max(std::fabs(shift), std::fabs(shift + mean));
  return variance > least * least && std::isfinite(variance);
}

// `indices(sums, out)` writes the indices, `each` of them a key; NaN where they do not exist.
template <class Indices>
std::vector<KeyShares> shares_of(const GroupSums& sums, std::size_t keys, std::size_t each, std::uint64_t seed,
                                 Indices&& indices) {
  std::vector<double> estimates(keys * each), again(keys * each);
  indices(sums.total().data(), estimates.data());
  std::vector<ResampleSpread> spreads(estimates.begin(), estimates.end());
  sums.each_resample(seed, [&](const std::vector<double>& s) {
    indices(s.data(), again.data());
    for (std::size_t i = 0; i < again.size(); ++i) spreads[i].take(again[i]);
  });
  const auto share = [&](std::size_t i) {
    const double half = 1.959963984540054 * spreads[i].standard_error();
    return Share{estimates[i], estimates[i] - half, estimates[i] + half};
  };
  std::vector<KeyShares> all;
  for (std::size_t j = 0; j < keys; ++j) {
    all.push_back({share(j * each), {}});
    if (each == 2) all.back().total = share(j * each + 1);
  }
  return all;
}

std::size_t bins_for(std::uint64_t points) {
  // Few enough that chance in a stretch weighs little, many enough that few wriggles hide in one: 2 N^(1/3).
  return std::clamp<std::size_t>(static_cast<std::size_t>(2.0 * std::cbrt(static_cast<double>(points))), 2, 64);
}

}  // namespace

SaltelliIndices::SaltelliIndices(std::uint64_t base_points, std::size_t keys)
    : points_(base_points), keys_(keys), sums_(base_points, of_keys + 3 * keys) {}

void SaltelliIndices::add(std::uint64_t base_point, std::span<const double> y) {
  if (!std::all_of(y.begin(), y.end(), [](double x) { return std::isfinite(x); })) return;
  if (used_++ == 0) shift_ = y[0];
  double* s = sums_.of(base_point);
  s[count] += 1.0;
  for (const double output : y) {
    const double off = output - shift_;
    s[outputs] += off, s[squares] += off * off;
  }
  const double b = y[1] - shift_;
  for (std::size_t j = 0; j < keys_; ++j) {
    const double change = y[2 + j] - y[0];
    double* key = s + of_keys + 3 * j;
    key[0] += b * change, key[1] += change, key[2] += change * change;
  }
}

Sensitivity SaltelliIndices::result(std::uint64_t seed) const {
  Sensitivity result{used_, points_ - used_, {}, ""};
  const std::vector<double> all = sums_.total();
  const auto members = static_cast<double>(keys_ + 2);
  if (used_ < least_points) {
    result.none = "too few points";
  } else if (const double n = members * all[count]; !varies(variance_of(all.data(), n), shift_, all[outputs] / n)) {
    result.none = "the figure does not vary";
  } else {
    result.keys = shares_of(sums_, keys_, 2, seed, [&](const double* s, double* out) {
      const double variance = variance_of(s, members * s[count]), mean = s[outputs] / (members * s[count]);
      for (std::size_t j = 0; j < keys_; ++j) {
        const double* key = s + of_keys + 3 * j;
        out[2 * j] = variance > 0.0 ? (key[0] - mean * key[1]) / (s[count] * variance) : nan;
        out[2 * j + 1] = variance > 0.0 ? key[2] / (2.0 * s[count] * variance) : nan;
      }
    });
  }
  return result;
}

BinnedIndices::BinnedIndices(std::uint64_t points, std::size_t keys, bool from_sequence)
    : points_(points),
      keys_(keys),
      bins_(bins_for(points)),
      from_sequence_(from_sequence),
      sums_(points, of_keys + 2 * keys * bins_for(points)) {}

void BinnedIndices::add(std::uint64_t point, std::span<const double> u, double output) {
  if (!std::isfinite(output)) return;
  if (used_++ == 0) shift_ = output;
  const double y = output - shift_;
  double* s = sums_.of(point);
  s[count] += 1.0, s[outputs] += y, s[squares] += y * y;
  for (std::size_t j = 0; j < keys_; ++j) {
    const auto bin = std::min(static_cast<std::size_t>(u[j] * static_cast<double>(bins_)), bins_ - 1);
    double* met = s + of_keys + 2 * (j * bins_ + bin);
    met[0] += 1.0, met[1] += y;
  }
}

Sensitivity BinnedIndices::result(std::uint64_t seed) const {
  Sensitivity result{used_, points_ - used_, {}, ""};
  const std::vector<double> all = sums_.total();
  if (used_ < std::max<std::uint64_t>(least_points, 2 * bins_)) {
    result.none = "too few points";
  } else if (!varies(variance_of(all.data(), all[count]), shift_, all[outputs] / all[count])) {
    result.none = "the figure does not vary";
  } else {
    result.keys = shares_of(sums_, keys_, 1, seed, [&](const double* s, double* out) {
      const double n = s[count], ss_all = n * variance_of(s, n);
      for (std::size_t j = 0; j < keys_; ++j) {
        double of_bins = 0.0, met = 0.0;
        for (std::size_t m = 0; m < bins_; ++m) {
          const double* bin = s + of_keys + 2 * (j * bins_ + m);
          if (bin[0] > 0.0) met += 1.0, of_bins += bin[1] * bin[1] / bin[0];
        }
        const double ss_within = std::max(s[squares] - of_bins, 0.0);
        out[j] = ss_all > 0.0 && n > met ? 1.0 - ss_within / (n - met) / (ss_all / (n - 1.0)) : nan;
      }
    });
    for (KeyShares& key : result.keys) {
      if (from_sequence_) key.first.high += static_cast<double>(bins_) / static_cast<double>(used_);
    }
  }
  return result;
}

}  // namespace slipbench
