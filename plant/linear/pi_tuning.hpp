// PI controllers by magnitude optimum and symmetric optimum, k (1 + 1/(s t_i)), for a plant with one large and one small lag.
//
//   magnitude optimum   plant g / ((1 + s T)(1 + s e)):  t_i = T, k = T / (2 g e)
//       closed loop 1 / (1 + 2 e s + 2 e^2 s^2): overshoot exp(-pi) = 4.3 %
//   symmetric optimum   plant g / (s T (1 + s e)):       t_i = a^2 e, k = T / (a g e)
//       closed loop (1 + a^2 e s) / ((1 + a e s)(1 + a (a - 1) e s + a^2 e^2 s^2)); phase margin atan((a^2 - 1) / (2 a)) at 1 / (a e)
//       a = 2 (the classic): overshoot 43.4 %, 8.1 % with the reference through 1 / (1 + a^2 e s)
//
// g gain of the plant, T large lag or integration time (s), e sum of the small ones (s), a > 1. A lag g / (1 + s T) of T >> e counts
// as g / (s T) for the symmetric optimum. LinearError: g = 0, T <= 0, e <= 0, a <= 1.
// Sources: C. Kessler, Regelungstechnik 6 1958, 395-400 and 432-436; J.W. Umland, M. Safiuddin, IEEE Trans. Ind. Appl. 26(3)
// 1990, 489-497 (a).
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct PiTuning {
  double gain = 0.0, integral_time_s = 0.0;
  double crossover_rad_s = 0.0, phase_margin_rad = 0.0;  // of the open loop
  double prefilter_s = 0.0;                              // lag for the reference that takes the zero away; 0: none
  std::vector<Complex> poles;                            // of the closed loop that the rule assumes
};

PiTuning magnitude_optimum(double plant_gain, double large_lag_s, double small_lags_s);
PiTuning symmetric_optimum(double plant_gain, double integration_s, double small_lags_s, double a = 2.0);

// The loop closed round a continuous plant of one input and output: input r, outputs [y; u], states [plant; integral of the error;
// prefilter if prefilter_s > 0].
System pi_loop(const System& plant, double gain, double integral_time_s, double prefilter_s = 0.0);

}  // namespace slipbench::linear
