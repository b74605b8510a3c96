// Descriptor systems E x' = A x + B u (E x[k+1] = ... when discrete) reduced to state space, E singular or not.
//
// With a number s0 that is no eigenvalue, M = (s0 E - A)^-1 E splits the variables into a part with dynamics (M invertible)
// and one that follows its inputs at once (M nilpotent of the pencil's index). The states kept are original variables, those
// with derivatives first; where a kept variable jumps with the input, the state is it less that jump. The others are
// redundant: `why` gives the row that fixes them. y = C x + D u is kept.
// LinearError: a singular pencil (det(s E - A) = 0 for every s: the equations leave a variable undetermined, which is named);
// an index of 2 or more whose output needs derivatives (future values) of the input, named.
// Tolerance: 1e-12 n on singular values of the row- and column-scaled pencil.
// Source: S.L. Campbell, "Singular Systems of Differential Equations", 1980 (Drazin inverse); index: Weierstrass form.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct Redundant {
  std::string variable, why;
};

struct Reduced {
  System system;
  std::vector<Redundant> redundant;
  int index = 0;        // 0: E invertible; 1: algebraic rows that fix their variable; more: constraints on derivatives
  std::string warning;  // E, or the choice of states, so near singular that digits are lost; else empty
};
Reduced reduce(const Matrix& E, const System& system);

}  // namespace slipbench::linear
