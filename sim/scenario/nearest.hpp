// The nearest known name to a misspelt one.
//
//   edit distance: fewest insertions, deletions, replacements and swaps of neighbours (restricted Damerau-Levenshtein)
// A name that only lacks its end ("inertia" for "inertia_kgm2") counts as one edit: forgotten units are the usual slip.
// Source: F.J. Damerau, "A technique for computer detection and correction of spelling errors", CACM 7(3), 1964.
#pragma once

#include <algorithm>
#include <cstddef>
#include <string_view>
#include <vector>

namespace slipbench {

// Names beyond 64 characters are compared by their first 64, so that a hostile key costs nothing.
inline std::size_t edit_distance(std::string_view a, std::string_view b) {
  a = a.substr(0, 64), b = b.substr(0, 64);
  const std::size_t n = b.size();
  std::vector<std::size_t> before(n + 1), last(n + 1), now(n + 1);
  for (std::size_t j = 0; j <= n; ++j) last[j] = j;
  for (std::size_t i = 1; i <= a.size(); ++i) {
    now[0] = i;
    for (std::size_t j = 1; j <= n; ++j) {
      now[j] = std::min({last[j] + 1, now[j - 1] + 1, last[j - 1] + (a[i - 1] == b[j - 1] ? 0u : 1u)});
      if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1]) now[j] = std::min(now[j], before[j - 2] + 1);
    }
    before.swap(last), last.swap(now);
  }
  return last[n];
}

// Distance for suggestions: a beginning of a known name is one edit away.
inline std::size_t name_distance(std::string_view typed, std::string_view known) {
  if (typed.size() >= 3 && typed != known && known.starts_with(typed)) return 1;
  return edit_distance(typed, known);
}

// The first of the closest; "" of none.
inline std::string_view nearest(std::string_view typed, const std::vector<std::string_view>& known) {
  std::string_view best;
  std::size_t least = static_cast<std::size_t>(-1);
  for (const std::string_view name : known) {
    const std::size_t d = name_distance(typed, name);
    if (d < least) least = d, best = name;
  }
  return best;
}

}  // namespace slipbench
