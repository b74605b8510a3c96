// Gain N of u = -K x + N r with which y settles at r: found two ways that must agree.
//
//   direct   [A B; C D] [X; U] = [0; I] (discrete: A - I), N = U + K X: X n x p the states, U m x p the inputs of a unit output
//   from the closed loop's DC gain   N = ((C - D K)(-(A - B K))^-1 B + D)^-1 (discrete: I - (A - B K))
//
// N m x p. Both are kept; their relative difference must lie within condition * 2^-52 * 100, else a warning stands.
// LinearError: not as many inputs as outputs; a zero at s = 0 (z = 1), where no steady input moves the output; a closed-loop pole there,
// named.
// Source: G. Franklin, J.D. Powell, A. Emami-Naeini, "Feedback Control of Dynamic Systems", ch. 7 (direct form).
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct ReferenceGain {
  Matrix N;                 // m x p, the direct one
  Matrix state, input;      // X, U
  Matrix N_from_dc_gain;    // m x p
  double difference = 0.0;  // relative, of the two
  double condition = 1.0;   // the larger of the two systems solved, kappa_2 after scaling rows and columns
  std::string warning;
};

ReferenceGain reference_gain(const System& system, const Matrix& K);

// LinearError "purpose can't be had: ..." where the outputs outnumber the inputs, or no steady input moves some combination of them.
void refuse_unsteerable(const System& system, const std::string& purpose);

}  // namespace slipbench::linear
