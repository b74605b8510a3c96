// Sets of poles: are they closed under conjugation, and how far is one set from another?
//
// match: the pairing of two sets of the same size is greedy, nearest pair first; pole_distance is the largest distance of a
// pair, relative to the larger of |wished| and 1e-3 of the largest pole (so that poles at zero have a scale), or of `size`: where
// all are wished at zero (dead beat), what they were moved from.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

// Real ones first, then pairs with the positive imaginary part in front; both by real part. An imaginary part below 1e-12 of the
// magnitude counts as zero. LinearError naming the first pole whose conjugate is missing.
std::vector<Complex> paired(std::vector<Complex> poles);

// order[i] is the index in found that was paired with wished[i].
std::vector<std::size_t> match(const std::vector<Complex>& wished, const std::vector<Complex>& found);

double pole_distance(const std::vector<Complex>& wished, const std::vector<Complex>& found, double size = 0.0);

// "-1, -2 + 3j, -2 - 3j"
std::string text_of(const std::vector<Complex>& poles);

}  // namespace slipbench::linear
