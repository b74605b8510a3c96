// The matrix exponential, by scaling and squaring with Pade approximants of degree 3 to 13.
//
// A n x n (0 too), balanced before. Backward error below eps ||A||_1 of the scaled matrix. LinearError where the result does
// not fit a double. Needs no exp of the C library.
// Source: N.J. Higham, "The scaling and squaring method for the matrix exponential revisited", SIAM J. Matrix Anal. 26, 2005.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

Matrix exponential(const Matrix& a);

}  // namespace slipbench::linear
