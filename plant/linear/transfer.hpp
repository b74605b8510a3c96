// The transfer function at one point: G(s) = C (s I - A)^-1 B + D, p x m; s = z for a discrete system.
//
// At a pole LinearError names it.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

ComplexMatrix transfer_at(const System& system, Complex s);

// Largest ||G_a - G_b||_F over sixteen points off both systems' poles (circles about as large as the poles), relative to the
// largest ||G_a||_F there: are these one plant? 0 for two systems without inputs or outputs; 1 where rounding leaves no such point.
double transfer_difference(const System& a, const System& b);

// C A^k B for k = 0 .. count-1: D's followers in the impulse response.
std::vector<Matrix> markov_parameters(const System& system, int count);

}  // namespace slipbench::linear
