// The gain that makes a rotor-flux observer driven by the back-EMF stable at every speed and load: it sets
// damping and stiffness of the flux error outright, in any quadrant.
//
// In the frame of the estimated flux (psi_hat real) the observer and the true flux obey
//   dpsi_hat/dt + j w_s psi_hat = E + g (e_d - Re E),    e_d = R_R i_d - alpha psi_hat,    g = g_d + j g_q
//   dpsi/dt     + j w_s psi     = E = R_R i - (alpha - j w_r) psi
// Only e_d, which holds no speed, corrects. With the error x + j y = psi_hat - psi, e_d - Re E = -alpha x -
// w_r y, exactly, so
//   d/dt [x; y] = [ -g_d alpha,  w_s - g_d w_r ; -w_s - g_q alpha,  -g_q w_r ] [x; y]
//   trace = -(g_d alpha + g_q w_r) = -A,     determinant = w_s^2 + w_s (g_q alpha - g_d w_r) = w_s^2 + w_s B.
// Both eigenvalues lie left if A > 0 and w_s^2 + w_s B > 0. Choosing A and B and solving for g:
//   A = floor alpha + 2 zeta min(|w_s|, w_cap)       B = stiffness alpha w_s / (|w_s| + w_0)
//   g_d = (alpha A - w_r B) / (alpha^2 + w_r^2)      g_q = (w_r A + alpha B) / (alpha^2 + w_r^2)
// The determinant is zero at w_s = 0 alone, where speed cannot be observed. g stays finite everywhere: alpha
// > 0. Far from the truth the law must not trap the estimate: with the flux nearly zero, g_d > 1 would push
// it back to zero, and a slip that no machine runs at would make g huge. So the correction fades with the
// flux, g times h = min(1, (2 |psi| / nominal)^2), which scales A and B alike (stable for any h > 0), and w_r
// enters g no further from w_s than the largest slip in use. w_s stator frequency, w_r rotor speed,
// electrical rad/s; w_0 rounds the sign of w_s; w_cap keeps the flux error slower than the speed loop at high
// frequency.
// Source: L. Harnefors, M. Hinkkanen, "Complete stability of reduced-order and full-order observers for
// sensorless IM drives", IEEE Trans. Ind. Electron. 55(3), 2008, 1319-1329 (idea: inherently sensorless
// correction, trace and determinant conditions); derivation and choice of A, B are this file's.
#pragma once

#include "plant/math/labels.hpp"
#include "plant/math/vec.hpp"

namespace slipbench {

inline constexpr double rad_per_turn = 6.28318530717958647693;

template <class Real>
struct FluxGain {
  Real alpha{};
  Real floor{};          // of A, 1/s
  Real twice_damping{};  // 2 zeta
  Real frequency_cap{};  // w_cap, rad/s
  Real stiffness{};      // of B, 1/s
  Real sign_width{};     // w_0, rad/s
  Real most_slip{};      // rad/s
  Real per_half_flux{};  // 2 / nominal flux, 1/Wb
  SLIPBENCH_FIELDS(alpha, floor, twice_damping, frequency_cap, stiffness, sign_width, most_slip, per_half_flux)
};

template <class Real>
Vec2<Real> flux_gain(const FluxGain<Real>& k, const Real& flux, const Real& w_s, const Real& speed) {
  section<Real>(
      "g: A = floor alpha + 2 zeta min(|w_s|, w_cap), B = stiffness alpha w_s / (|w_s| + w_0), fading with the flux");
  const Real frequency = fabs(w_s), one(1.0);
  const Real w_r = w_s + clamp(speed - w_s, -k.most_slip, k.most_slip);
  const Real a = k.floor + k.twice_damping * min(frequency, k.frequency_cap);
  const Real b = k.stiffness * w_s / (frequency + k.sign_width);
  const Real per = min(square(k.per_half_flux * flux), one) / (k.alpha * k.alpha + w_r * w_r);
  const Vec2<Real> g{per * (k.alpha * a - w_r * b), per * (w_r * a + k.alpha * b)};
  label("w_r_bounded", w_r);
  label("A", a);
  label("B", b);
  label_d_q("g", g);
  return g;
}

// Bound on the correction g (e_d - Re E), V: half the nominal back-EMF at this frequency, and the nominal
// flux once a rotor time constant. Near the truth it never acts; far from it the back-EMF keeps the upper
// hand and turns the estimate round.
template <class Real>
Real most_correction(const FluxGain<Real>& k, const Real& w_s) {
  return (fabs(w_s) + Real(2.0) * k.alpha) / k.per_half_flux;
}

}  // namespace slipbench
