// The drive with all six switches open and the stator currents gone: the rotor flux decays alone, the shaft coasts.
//
//   d psi_r / dt = (-1 / tau_r + j w_r) psi_r,  tau_r = L_r / R_r
//   i_s = 0,  psi_s = (L_m / L_r) psi_r,  u = d psi_s / dt,  T = 0
//
// Symbols as in machine.hpp. In truth the currents run out through the free-wheeling diodes into the DC link, against its whole
// voltage: within about L_sigma i / (2/3 V_dc), half a millisecond at rated current. Here they are gone at once, their energy
// with them; the rotor flux does not jump. Holds while the line-to-line peak sqrt(3) |u| stays below the DC link: beyond, the
// diodes rectify and brake, which is not modelled (`diodes_conduct`).
// Source: P.C. Krause, O. Wasynczuk, S.D. Sudhoff, "Analysis of Electric Machinery and Drive Systems", 2nd ed., 2002, ch. 4,
// with i_s = 0.
#pragma once

#include "plant/drive.hpp"

namespace slipbench {

// The fluxes just after opening.
template <class Real>
MachineFlux<Real> opened(const Machine<Real>& m, const MachineFlux<Real>& psi) {
  return {(m.per_Lm / m.per_Ls) * psi.rotor, psi.rotor};
}

template <class Real>
MachineFlux<Real> open_stator_derivative(const Machine<Real>& m, const MachineFlux<Real>& psi,
                                         const Real& electrical_speed) {
  const Vec2<Real> rotor = electrical_speed * quarter_turn(psi.rotor) - m.R_r * rotor_current(m, psi);
  return {(m.per_Lm / m.per_Ls) * rotor, rotor};
}

template <class Real>
Vec2<Real> open_stator_voltage(const Machine<Real>& m, const MachineFlux<Real>& psi, const Real& electrical_speed) {
  return open_stator_derivative(m, opened(m, psi), electrical_speed).stator;
}

template <class Real>
MaskOf<Real> diodes_conduct(const Vec2<Real>& open_voltage, const Real& dc_link) {
  return dc_link < Real(1.7320508075688772935) * magnitude(open_voltage);
}

template <class Real>
void open_drive_derivative(const Drive<Real>& d, const DriveInput<Real>& in, const DriveState<Real>& x, double t,
                           DriveState<Real>& dx) {
  const Real speed = d.speed_imposed ? in.imposed_speed.at(t) : x[4];
  const MachineFlux<Real> dpsi = open_stator_derivative(d.machine, flux_of(x), d.machine.pole_pairs * speed);
  dx[0] = dpsi.stator.x;
  dx[1] = dpsi.stator.y;
  dx[2] = dpsi.rotor.x;
  dx[3] = dpsi.rotor.y;
  dx[4] = d.speed_imposed ? in.imposed_speed.slope : -d.shaft.per_inertia * total_resistance(d, in, speed, t);
  dx[5] = speed;
}

}  // namespace slipbench
