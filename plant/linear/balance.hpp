// Balancing: state, input and output units changed by powers of two so that no number drowns beside another.
//
//   x = diag(state) z,  u = diag(input) v,  y = diag(output) w
//   A_b = S^-1 A S,  B_b = S^-1 B diag(input),  C_b = diag(output)^-1 C S,  D_b = diag(output)^-1 D diag(input)
//
// Exact (powers of two round nothing). S makes the rows of [A B] and the columns of [A; C] alike in size; inputs and
// outputs are scaled so that each column of B and row of C is about as large as A. A zero row or column keeps its unit.
// Balancing also lifts rounding noise that stands beside zeros: callers that decide a rank compare with the given units.
// Source: B.N. Parlett, C. Reinsch, Numer. Math. 13, 1969; D.S. Watkins, ETNA 23, 2006 on its harm.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct BalancedUnits {
  System system;
  Vector state, input, output;
};
BalancedUnits in_balanced_units(const System& system);

// S alone, for a square matrix: S^-1 A S.
Vector balancing_scale(const Matrix& a);

}  // namespace slipbench::linear
