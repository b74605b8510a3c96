// Minimal realisations: the smallest system with the same transfer function.
//
//   x_r = L x,  x ~ R x_r,  L R = I:  A_r = L A R,  B_r = L B,  C_r = C R,  D_r = D     L r x n, R n x r
//
// minimal: the controllable and observable part of the Kalman form (any system). `removed`: a sentence for each mode left
// out, with the state it lives in, or "a combination of ..." with the largest weights (in balanced units), and why.
// balanced: stable systems only (LinearError names the mode). Both Gramians equal diag(hankel), falling. States whose
// Hankel singular value is lost in the rounding of the Gramians (n sqrt(eps) of the largest) are removed too; each costs
// at most twice that value in gain.
// Source: B.C. Moore, IEEE TAC 26, 1981; A.J. Laub et al., IEEE TAC 32, 1987 (square root method); K. Glover 1984 (bound).
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct Minimal {
  System system;
  std::vector<std::string> removed;
  Matrix L, R;
  Vector hankel;          // balanced only: all Hankel singular values of the minimal part, falling
  double residual = 0.0;  // transfer_difference to the system given
  std::string warning;
};
Minimal minimal(const System& system);
Minimal balanced(const System& system);

}  // namespace slipbench::linear
