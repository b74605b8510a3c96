// The largest value of a function over the unit cube, within a budget of evaluations. The only place that knows NLopt.
//
//   1. corners (where they are few), the centre and Sobol points, in one batch          a third of the budget
//   2. DIRECT-L, which halves where large values may hide                               a quarter
//   3. BOBYQA (in one dimension Subplex) from the best point, then from the best far from where it has been   the rest
//
// Deterministic: a seed moves the Sobol points, nothing else is drawn. A point that comes up again is not evaluated again.
// Sources: D.R. Jones, C.D. Perttunen, B.E. Stuckman, J. Optim. Theory Appl. 79(1), 1993, 157-181; J.M. Gablonsky, C.T. Kelley,
// J. Glob. Optim. 21, 2001, 27-37 (DIRECT-L); M.J.D. Powell, Cambridge NA report 2009/06 (BOBYQA); T. Rowan, PhD thesis, 1990.
#pragma once

#include <cstdint>
#include <functional>
#include <vector>

namespace slipbench {

using Point = std::vector<double>;

// One value a point. NaN: none there, the point is passed over. Infinity: nothing is worse, the search ends. It may return fewer
// values than points: then the search was stopped, and ends.
using Judge = std::function<std::vector<double>(const std::vector<Point>&)>;

struct SearchOutcome {
  Point best;  // empty: no point had a value
  double value = 0.0;
  std::size_t evaluations = 0;
  bool flat = false;     // every point had the same value
  bool stopped = false;  // by the judge
};

// dimensions >= 1, budget >= 1. Evaluates at most `budget` points.
SearchOutcome largest_in_cube(std::size_t dimensions, std::size_t budget, std::uint64_t seed, const Judge& judge);

}  // namespace slipbench
