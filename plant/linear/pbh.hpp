// Each mode controllable, observable? The test of Popov, Belevitch and Hautus, in balanced units.
//
//   controllability = smallest singular value of [(A - p I)/||A||, B/||B||], observability that of [(A - p I)/||A||; C/||C||]
//
// A mode is controllable when the value exceeds `tolerance`: 1e-12 n, widened by how well the pole itself is known
// (n eps / |y'x| for its left and right unit eigenvectors; the spread of a repeated pole). Stabilisable: every mode of the
// staircase's uncontrollable part is stable (marginal is not); detectable: the same for the unobservable part.
// Source: M.L.J. Hautus, Indag. Math. 31, 1969.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct ModeTest {
  Complex pole;
  bool controllable = true, observable = true;
  double controllability = 1.0, observability = 1.0;
  double tolerance = 0.0;
};

// In the order of modes_of.
std::vector<ModeTest> pbh(const System& system);

// why (may be null): the mode that stands in the way, or a sentence that says there is none.
bool stabilisable(const System& system, std::string* why = nullptr);
bool detectable(const System& system, std::string* why = nullptr);

}  // namespace slipbench::linear
