// Current controller in the rotor-flux frame, down to the legs' duties.
//
//   machine     u = R i + L_sigma di/dt + j w_s L_sigma i + e,  e = (j p w_m - 1/tau_r) (L_m/L_r) psi
//   controller  u = k_p (i_ref - i) + x + j w_s L_sigma i + e,  x' = k_i (i_ref - i + (u_applied - u) / k_p)
//   k_p = alpha_c L_sigma, k_i = alpha_c R, R = R_s + (L_m/L_r)^2 R_r
//
// The PI's zero cancels the machine's pole R / L_sigma: the open loop is alpha_c / s with a delay of (d + 1/2) T. In
// samples, d = 1: i(k+1) = i(k) + alpha_c T (i_ref(k-1) - i(k-1)), both poles at 1/2 for alpha_c T = 1/4.
//
// Voltage limit, delay and dead time: voltage_command.hpp. Anti-windup is back-calculation from the voltage that the duties
// really give.
//
// u V, i A, psi Wb (all peak), alpha_c rad/s.
// Source: L. Harnefors, H.-P. Nee, "Model-based current control of AC machines using the internal model control
// method", IEEE Trans. Ind. Appl. 34(1), 1998, 133-141 (from memory).
#pragma once

#include "controllers/voltage_command.hpp"

namespace slipbench {

template <class Real>
struct CurrentConstants {
  Real k_p{}, k_i_period{}, back{};  // ohm, ohm per period, R T / L_sigma
  Real resistance{}, leakage{};      // R, L_sigma
  Real flux_ratio{}, rotor_rate{};   // L_m / L_r, 1 / tau_r
  Real delay{};                      // d
  LegConstants<Real> legs;
  SLIPBENCH_FIELDS(k_p, k_i_period, back, resistance, leakage, flux_ratio, rotor_rate, delay, legs)
};

template <class Real>
struct CurrentState {
  Vec2<Real> integral;  // x, V
  CommandedVoltages<Real> commanded{};
  Real asked{};  // |u| before the limit
  SLIPBENCH_FIELDS(integral, commanded, asked)
};

template <class Real>
Real voltage_limit(const CurrentConstants<Real>& c, const Real& dc_link) {
  return voltage_limit(c.legs, dc_link);
}

template <class Real>
VoltageCommand<Real> control_current(CurrentState<Real>& s, const CurrentConstants<Real>& c, const RotorFrame<Real>& f,
                                     const Vec2<Real>& reference, const Real& limit, const Real& dc_link) {
  section<Real>("u = k_p (i_ref - i) + x + j w_s L_sigma i + e,  e = (j p w_m - 1/tau_r) (L_m/L_r) psi");
  const Vec2<Real> error = reference - f.current;
  const Real emf = c.flux_ratio * f.flux, drop = f.stator_frequency * c.leakage;
  const Vec2<Real> forward{-drop * f.current.y - c.rotor_rate * emf, drop * f.current.x + f.electrical_speed * emf};
  const Vec2<Real> wanted = c.k_p * error + s.integral + forward;
  s.asked = magnitude(wanted);
  label_d_q("error", error);
  SLIPBENCH_LABEL(emf, drop)
  label_d_q("wanted", wanted);

  const VoltageCommand<Real> out = command_voltage(s.commanded, c.legs, f, wanted, reference, limit, dc_link);
  section<Real>("x' = k_i (i_ref - i + (u_applied - u) / k_p), held within the circle");
  const Vec2<Real> integral = s.integral + c.k_i_period * error + c.back * out.missing;
  label_d_q("integral", integral);
  s.integral = {clamp(integral.x, -limit, limit), clamp(integral.y, -limit, limit)};
  return out;
}

}  // namespace slipbench
