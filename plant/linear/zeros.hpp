// Zeros and DC gain.
//
// Invariant zeros: s where [A - s I, B; C, D] loses rank (below its normal rank); the finite ones. The pencil is reduced to
// one with a square invertible D, then solved by QZ. Transmission zeros: those of the minimal realisation, so without
// modes that cancel. None without states, inputs or outputs. Order as poles.
// DC gain: G(0) = D - C A^-1 B, discrete G(1) = D + C (I - A)^-1 B, p x m. An integrator that the transfer function does
// not hold does not disturb; one that it holds has no DC gain: LinearError names the pole and its state.
// Source: A. Emami-Naeini, P. Van Dooren, "Computation of zeros of linear multivariable systems", Automatica 18, 1982.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

std::vector<Complex> invariant_zeros(const System& system);
std::vector<Complex> transmission_zeros(const System& system);
Matrix dc_gain(const System& system);

}  // namespace slipbench::linear
