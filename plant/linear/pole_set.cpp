#include "plant/linear/pole_set.hpp"

#include <algorithm>

#include "plant/linear/dense.hpp"

namespace slipbench::linear {
namespace {

// Poles come from files with a few digits or from a solver: conjugates agree to this.
constexpr double same = 1e-9;

}  // namespace

std::vector<Complex> paired(std::vector<Complex> poles) {
  for (auto& p : poles)
    if (std::abs(p.imag()) <= 1e-12 * magnitude(p)) p = p.real();
  std::sort(poles.begin(), poles.end(), [](Complex a, Complex b) {
    if ((a.imag() == 0.0) != (b.imag() == 0.0)) return a.imag() == 0.0;
    if (a.real() != b.real()) return a.real() < b.real();
    return a.imag() > b.imag();
  });
  std::vector<Complex> result, waiting;
  for (const auto p : poles) {
    if (p.imag() == 0.0)
      result.push_back(p);
    else if (p.imag() > 0.0)
      waiting.push_back(p);
  }
  std::vector<Complex> lower;
  for (const auto p : poles)
    if (p.imag() < 0.0) lower.push_back(p);
  for (const auto p : waiting) {
    const auto mate = std::find_if(lower.begin(), lower.end(),
                                   [&](Complex q) { return magnitude(std::conj(q) - p) <= same * magnitude(p); });
    if (mate == lower.end())
      throw LinearError("the pole " + text_of(p) + " lacks its conjugate " + text_of(std::conj(p)) +
                        ": a real gain places conjugate pairs only");
    lower.erase(mate);
    result.push_back(p);
    result.push_back(std::conj(p));
  }
  if (!lower.empty())
    throw LinearError("the pole " + text_of(lower.front()) + " lacks its conjugate " +
                      text_of(std::conj(lower.front())) + ": a real gain places conjugate pairs only");
  return result;
}

std::vector<std::size_t> match(const std::vector<Complex>& wished, const std::vector<Complex>& found) {
  const auto n = wished.size();
  if (found.size() != n)
    throw LinearError("sets of " + std::to_string(n) + " and " + std::to_string(found.size()) + " poles do not pair");
  struct Pair {
    double distance;
    std::size_t i, j;
  };
  std::vector<Pair> pairs;
  for (std::size_t i = 0; i < n; ++i)
    for (std::size_t j = 0; j < n; ++j) pairs.push_back({magnitude(wished[i] - found[j]), i, j});
  std::stable_sort(pairs.begin(), pairs.end(), [](const Pair& a, const Pair& b) { return a.distance < b.distance; });
  std::vector<std::size_t> order(n, n);
  std::vector<bool> taken(n, false);
  for (const auto& p : pairs)
    if (order[p.i] == n && !taken[p.j]) order[p.i] = p.j, taken[p.j] = true;
  return order;
}

double pole_distance(const std::vector<Complex>& wished, const std::vector<Complex>& found, double size) {
  const auto order = match(wished, found);
  double largest = size, distance = 0.0;
  for (const auto p : wished) largest = std::max(largest, magnitude(p));
  for (const auto p : found) largest = std::max(largest, magnitude(p));
  if (largest == 0.0) return 0.0;
  for (std::size_t i = 0; i < wished.size(); ++i)
    distance =
        std::max(distance, magnitude(wished[i] - found[order[i]]) / std::max(magnitude(wished[i]), 1e-3 * largest));
  return distance;
}

std::string text_of(const std::vector<Complex>& poles) {
  std::string text;
  for (const auto p : poles) text += (text.empty() ? "" : ", ") + text_of(p);
  return text;
}

}  // namespace slipbench::linear
