// Controllability and observability Gramians of a stable system.
//
//   continuous: A Wc + Wc A' + B B' = 0,  A' Wo + Wo A + C'C = 0;  discrete: A Wc A' - Wc + B B' = 0,  A' Wo A - Wo + C'C = 0
//
// n x n, symmetric, positive semidefinite; their ranks are those of the pair. LinearError names the mode that is not stable.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct Gramians {
  Matrix controllability, observability;
  double residual = 0.0;  // the worse of the two, relative
  std::string warning;    // residual or condition beyond trust; else empty
};
Gramians gramians(const System& system);

}  // namespace slipbench::linear
