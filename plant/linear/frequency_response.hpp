// Frequency response G(jw) = C (jw I - A)^-1 B + D; discrete: at z = exp(jwT). Gain and phase.
//
// A is brought to Hessenberg form once; each frequency is one elimination with pivoting of order n^2.
// gain and phase_rad are p x m; phase in (-pi, pi]; `unwrapped` in the list of frequencies makes it continuous from row to row.
// LinearError: a frequency at which the system has a pole (named), w < 0 or not finite.
// Source: A.J. Laub, IEEE TAC 26(2) 1981, 407-408.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct FrequencyPoint {
  double frequency_rad_s = 0.0;
  ComplexMatrix G;         // p x m
  Matrix gain, phase_rad;  // p x m
};

FrequencyPoint frequency_response(const System& system, double frequency_rad_s);
std::vector<FrequencyPoint> frequency_response(const System& system, const std::vector<double>& frequencies_rad_s);

// count frequencies from first to last, evenly on a logarithmic scale.
std::vector<double> logarithmic(double first, double last, std::size_t count);

}  // namespace slipbench::linear
