// The gain that makes a rotor-flux observer driven by the back-EMF stable at every speed and load: it sets damping and
// stiffness of the flux error outright, in any quadrant.
//
// In the frame of the estimated flux (psi_hat real) the observer and the true flux obey
//   dpsi_hat/dt + j w_s psi_hat = E + g (e_d - Re E),    e_d = R_R i_d - alpha psi_hat,    g = g_d + j g_q
//   dpsi/dt     + j w_s psi     = E = R_R i - (alpha - j w_r) psi
// Only e_d, which holds no speed, corrects. With the error x + j y = psi_hat - psi, e_d - Re E = -alpha x - w_r y + ...:
// to first order (terms in w_r cancel against psi_hat's imaginary part, which is zero)
//   d/dt [x; y] = [ -g_d alpha,  w_s - g_d w_r ; -w_s - g_q alpha,  -g_q w_r ] [x; y]
//   trace = -(g_d alpha + g_q w_r) = -A,     determinant = w_s^2 + w_s (g_q alpha - g_d w_r) = w_s^2 + w_s B.
// Both eigenvalues lie left if A > 0 and w_s^2 + w_s B > 0. Choosing A and B and solving for g:
//   A = floor alpha + 2 zeta min(|w_s|, w_cap)       B = stiffness alpha w_s / (|w_s| + w_0)
//   g_d = (alpha A - w_r B) / (alpha^2 + w_r^2)      g_q = (w_r A + alpha B) / (alpha^2 + w_r^2)
// The determinant is zero at w_s = 0 alone, where speed cannot be observed. g stays finite everywhere: alpha > 0.
// w_s stator frequency, w_r rotor speed, electrical rad/s; w_0 rounds the sign of w_s; w_cap keeps the flux error slower than the
// speed loop at high frequency.
// Source: L. Harnefors, M. Hinkkanen, "Complete stability of reduced-order and full-order observers for sensorless IM
// drives", IEEE Trans. Ind. Electron. 55(3), 2008, 1319-1329 (idea: inherently sensorless correction, trace and determinant
// conditions); derivation and choice of A, B are this file's.
#pragma once

#include "plant/math/vec.hpp"

namespace slipbench {

inline constexpr double rad_per_turn = 6.28318530717958647693;

template <class Real>
struct FluxGain {
  Real alpha{};
  Real floor{};                // of A, 1/s
  Real twice_damping{};        // 2 zeta
  Real frequency_cap{};        // w_cap, rad/s
  Real stiffness{};            // of B, 1/s
  Real sign_width{};           // w_0, rad/s
  SLIPBENCH_FIELDS(alpha, floor, twice_damping, frequency_cap, stiffness, sign_width)
};

// zeta, stiffness in units of alpha, and the frequency above which damping grows no further.
inline FluxGain<double> flux_gain_for(double alpha, double damping, double stiffness, double frequency_cap_Hz) {
  constexpr double sign_width_Hz = 0.2;
  return {alpha, alpha, 2.0 * damping, rad_per_turn * frequency_cap_Hz, stiffness * alpha, rad_per_turn * sign_width_Hz};
}

template <class Real>
Vec2<Real> flux_gain(const FluxGain<Real>& k, const Real& w_s, const Real& w_r) {
  const Real frequency = fabs(w_s);
  const Real a = k.floor + k.twice_damping * min(frequency, k.frequency_cap);
  const Real b = k.stiffness * w_s / (frequency + k.sign_width);
  const Real per = Real(1.0) / (k.alpha * k.alpha + w_r * w_r);
  return {per * (k.alpha * a - w_r * b), per * (w_r * a + k.alpha * b)};
}

}  // namespace slipbench
