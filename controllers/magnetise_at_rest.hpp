// Rotor flux up before the shaft is to turn, and held until it is: direct current along a standing axis, pushed for speed.
//
//   i* = min((psi_ref + g (psi_ref - psi)) / L_m, I),  psi' = (L_m i_x - psi) / tau_r                  (shaft at rest)
//   u = R_s i* + k_p (i* - i) + x,  x' = k_i (i* - i),  k_p = alpha L_sigma, k_i = alpha R_s
//
// The integral makes up for a dead time or resistance that is believed wrong: at a few volts they are all there is. The shaft is
// believed at rest; one that turns is braked by it. psi rotor flux Wb (peak), i A, u V, alpha rad/s.
// Source: common practice.
#pragma once

#include "controllers/control.hpp"

namespace slipbench {

template <class Real>
struct MagnetiseConstants {
  Real flux{}, push{};     // psi_ref, g
  Real L_m{}, approach{};  // approach: 1 - e^(-T / tau_r)
  Real limit{};            // I, A
  Real R_s{}, k_p{}, k_i_period{};
  Real enough{};  // share of psi_ref
  SLIPBENCH_FIELDS(flux, push, L_m, approach, limit, R_s, k_p, k_i_period, enough)
};

template <class Real>
struct MagnetiseState {
  Real flux{};  // modelled, Wb
  Vec2<Real> integral;
  Real done{};  // 1 once the flux has been up
  SLIPBENCH_FIELDS(flux, integral, done)
};

// Voltage in the standing frame; of use while not done. Done once the flux has been up and there is somewhere to go.
template <class Real>
Vec2<Real> magnetise(MagnetiseState<Real>& s, const MagnetiseConstants<Real>& c, const Vec2<Real>& current,
                     const Real& speed_reference) {
  section<Real>("magnetising at rest: u = R_s i* + k_p (i* - i) + x");
  const Real zero(0.0), one(1.0);
  s.flux = s.flux + c.approach * (c.L_m * current.x - s.flux);
  const MaskOf<Real> waits = fabs(speed_reference) <= zero;
  s.done = select(s.flux < c.enough * c.flux, s.done, select(waits, s.done, one));
  const Real wanted = clamp((c.flux + c.push * (c.flux - s.flux)) / c.L_m, zero, c.limit);
  const Vec2<Real> error{wanted - current.x, -current.y};
  s.integral = select(s.done < Real(0.5), s.integral + c.k_i_period * error, s.integral);
  label("magnetising_flux", s.flux);
  label("magnetised", s.done);
  label("magnetising_current", wanted);
  SLIPBENCH_LABEL(waits)
  return Vec2<Real>{c.R_s * wanted, zero} + c.k_p * error + s.integral;
}

}  // namespace slipbench
