// Discretisation of a continuous system at a period T in s, and what it costs.
//
//   zero_order_hold: A_d = e^(A T), B_d = (integral of e^(A t) from 0 to T) B; exact for inputs held over a period
//   euler:           A_d = I + A T, B_d = B T
//   tustin:          s = 2/T (z - 1)/(z + 1):  A_d = W (I + A T/2), B_d = W B T, C_d = C W, D_d = D + C W B T/2,
//                    W = (I - A T/2)^-1; its state is (I - A T/2) x - (B T/2) u, not x itself
//
// LinearError: a discrete system, a period not above 0, a pole at 2/T for Tustin.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

enum class Discretisation { zero_order_hold, euler, tustin };
const char* name_of(Discretisation method);  // "zero_order_hold", "euler", "tustin"

System discretise(const System& system, double period_s, Discretisation method);

// response_*: worst ||G_d(e^(jwT)) - G(jw)||_F / ||G(jw)||_F over 0 < w <= a tenth, or half, of the Nyquist frequency pi/T
// (40 frequencies a decade over three decades); a hold delays by T/2, and that counts as its error.
// pole: largest |z_i - e^(p_i T)| of pairs matched nearest first. warning: a stable system made unstable, else empty.
struct DiscretisationError {
  double response_to_tenth = 0.0, response_to_half = 0.0, pole = 0.0;
  std::string warning;
};
DiscretisationError discretisation_error(const System& system, double period_s, Discretisation method);

}  // namespace slipbench::linear
