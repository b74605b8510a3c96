// How much flux, and so how much d current: the reference's flux, lowered where the voltage would not do.
//
//   u_av = margin U - R_s |i|,  i_d,max = sqrt((u_av / w_s)^2 - (L_sigma i_q)^2) / L_s
//   psi_ref = min(psi_limit, trim L_m i_d,max), through a first-order filter
//   trim' = alpha_flux / 4 (u_1 - |u|) / U, within 0.5..1, |u| what the current loop asked for: stays at 1 with matched
//           parameters; lowers the flux where wrong ones or a late speed would leave the current loop without voltage
//   i_d = (psi_ref + g (psi_ref - psi)) / L_m,  g = tau_r alpha_flux: flux follows at alpha_flux + 1/tau_r
//   |i_q| <= least of  sqrt(I^2 - i_d^2)                          (d first, q takes what is left)
//                      margin U / (sqrt 2 |w_s| L_sigma)          (pull-out: L_sigma i_q = L_s i_d)
//                      q > 0 of (w_s psi_d + R_s q)^2 + (w_s L_sigma q)^2 = u_1^2,  psi_d = psi L_m/L_r + L_sigma i_d
//
// The root is held at its pull-out value, so a demand for more torque than there is cannot strip the flux. The last
// bound acts while the flux lags its reference (fast acceleration), so that q current is not asked for that the
// voltage cannot drive; it leaves a tenth of I, so that torque never vanishes. U limit of the voltage circle V, u_1
// half-way between margin U and U, w_s stator frequency rad/s, psi rotor flux Wb, I current limit A.
// Source: S.-H. Kim, S.-K. Sul, "Maximum torque control of an induction machine in the field weakening region", IEEE
// Trans. Ind. Appl. 31(4), 1995, 787-794 (limits, from memory); the feedforward and the flux law derived here.
#pragma once

#include "controllers/orientation.hpp"

namespace slipbench {

template <class Real>
struct FluxConstants {
  Real limit{};                                       // psi_limit, Wb
  Real margin{};                                      // share of U
  Real R_s{}, L_s{}, leakage{}, L_m{}, flux_ratio{};  // leakage: L_sigma = sigma L_s; flux_ratio: L_m / L_r
  Real filter{};                                      // share of the way per period
  Real flux_gain{};                                   // g
  Real least_i_d{};                                   // A, negative: takes flux down faster than letting it decay
  Real current_limit{};                               // I, A peak
  Real frequency_floor{};                             // rad/s
  Real magnetised_share{};
  Real trim_rate{};  // alpha_flux T / 4
  SLIPBENCH_FIELDS(limit, margin, R_s, L_s, leakage, L_m, flux_ratio, filter, flux_gain, least_i_d, current_limit,
                   frequency_floor, magnetised_share, trim_rate)
};

template <class Real>
struct FluxState {
  Real reference{};   // filtered, Wb
  Real magnetised{};  // 1 once the flux has been up: torque is free
  Real trim{};
  SLIPBENCH_FIELDS(reference, magnetised, trim)
};

// The flux that voltage U allows at this stator frequency with this q current, times the trim, at most the limit.
template <class Real>
Real allowed_flux(const FluxConstants<Real>& c, const Real& voltage_limit, const Real& stator_frequency,
                  const Vec2<Real>& current, const Real& trim) {
  const Real available = max(c.margin * voltage_limit - c.R_s * magnitude(current), Real(0.0));
  const Real linkage = available / max(fabs(stator_frequency), c.frequency_floor);
  const Real full = square(linkage);
  const Real left = max(full - square(c.leakage * current.y), Real(0.5) * full);
  return min(c.limit, trim * c.L_m * sqrt(left) / c.L_s);
}

template <class Real>
struct FluxCommand {
  Real i_d{}, i_q_limit{};
};

// Of the tick before: `last`, the current reference (d-q), and `asked`, the length of the voltage before its limit.
template <class Real>
FluxCommand<Real> control_flux(FluxState<Real>& s, const FluxConstants<Real>& c, const RotorFrame<Real>& f,
                               const Real& voltage_limit, const Vec2<Real>& last, const Real& asked) {
  section<Real>("psi_ref = min(psi_limit, trim L_m i_d,max), filtered;  trim' = alpha_flux / 4 (u_1 - |u|) / U");
  const Real zero(0.0), one(1.0), fifth(0.2);
  const Real reachable = Real(0.5) * (one + c.margin) * voltage_limit;
  const Real room_left = clamp((reachable - asked) / max(voltage_limit, Real(1e-3)), -fifth, fifth);
  s.trim = clamp(s.trim + c.trim_rate * room_left, Real(0.5), one);
  const Real allowed = allowed_flux(c, voltage_limit, f.stator_frequency, last, s.trim);
  s.reference = s.reference + c.filter * (allowed - s.reference);
  s.magnetised = select(f.flux < c.magnetised_share * s.reference, s.magnetised, one);

  SLIPBENCH_LABEL(reachable, room_left, allowed)
  label("trim", s.trim);
  label("psi_reference", s.reference);
  label("magnetised", s.magnetised);
  section<Real>("i_d = (psi_ref + g (psi_ref - psi)) / L_m");
  FluxCommand<Real> out;
  const Real wanted = (s.reference + c.flux_gain * (s.reference - f.flux)) / c.L_m;
  out.i_d = clamp(wanted, c.least_i_d, c.current_limit);
  label("i_d_reference", out.i_d);

  section<Real>("|i_q| at most what current limit, pull-out and voltage leave");
  const Real by_current = sqrt(max(square(c.current_limit) - square(out.i_d), zero));
  const Real w = max(fabs(f.stator_frequency), c.frequency_floor), reactance = w * c.leakage;
  const Real pull_out = Real(0.70710678118654752440) * c.margin * voltage_limit / reactance;
  const Real emf = w * max(c.flux_ratio * f.flux + c.leakage * out.i_d, zero);
  const Real impedance2 = square(c.R_s) + square(reactance), along = c.R_s * emf;
  const Real room = max(square(along) + impedance2 * (square(reachable) - square(emf)), zero);
  const Real by_voltage = (sqrt(room) - along) / impedance2;
  const Real by_speed = max(min(pull_out, by_voltage), Real(0.1) * c.current_limit);
  out.i_q_limit = select(s.magnetised > Real(0.5), min(by_current, by_speed), zero);
  label("back_emf", emf);
  SLIPBENCH_LABEL(by_current, w, reactance, pull_out, impedance2, along, room, by_voltage, by_speed)
  label("i_q_limit", out.i_q_limit);
  return out;
}

}  // namespace slipbench
