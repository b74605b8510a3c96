// Induction machine, fifth order with the shaft: stator and rotor flux linkages as states, T circuit, stationary frame.
//
//   d psi_s / dt = u - R_s i_s
//   d psi_r / dt = -R_r i_r + j w_r psi_r
//   i_s = (L_r psi_s - L_m psi_r) / D,  i_r = (L_s psi_r - L_m psi_s) / D,  D = L_s L_r - L_m^2
//   T = 3/2 p Im(conj(psi_s) i_s)
//
// psi Wb (peak), i A (peak), u V (peak), w_r electrical rad/s, T N m, p pole pairs. Motor convention.
// Source: P.C. Krause, O. Wasynczuk, S.D. Sudhoff, "Analysis of Electric Machinery and Drive Systems", 2nd ed., 2002, ch. 4.
#pragma once

#include "plant/math/vec.hpp"
#include "plant/parameters.hpp"

namespace slipbench {

template <class Real>
struct Machine {
  Real pole_pairs{};
  Real R_s{}, R_r{};                  // ohm
  Real per_Ls{}, per_Lr{}, per_Lm{};  // L_r/D, L_s/D, L_m/D: stator, rotor and mutual inverse inductances, 1/H
  Real torque_factor{};               // 3/2 p
  SLIPBENCH_FIELDS(pole_pairs, R_s, R_r, per_Ls, per_Lr, per_Lm, torque_factor)
};

template <class Real>
Machine<Real> make_machine(const Circuit<Real>& c) {
  const Real L_s = c.stator_inductance(), L_r = c.rotor_inductance(), L_m = c.magnetizing_inductance;
  const Real per_D = Real(1.0) / (L_s * L_r - L_m * L_m);
  return {c.pole_pairs, c.stator_resistance, c.rotor_resistance,      L_r * per_D,
          L_s * per_D,  L_m * per_D,         Real(1.5) * c.pole_pairs};
}

template <class Real>
struct MachineFlux {
  Vec2<Real> stator, rotor;  // psi_s, psi_r, Wb
  SLIPBENCH_FIELDS(stator, rotor)
};

template <class Real>
Vec2<Real> stator_current(const Machine<Real>& m, const MachineFlux<Real>& psi) {
  return m.per_Ls * psi.stator - m.per_Lm * psi.rotor;
}
template <class Real>
Vec2<Real> rotor_current(const Machine<Real>& m, const MachineFlux<Real>& psi) {
  return m.per_Lr * psi.rotor - m.per_Lm * psi.stator;
}
template <class Real>
Real torque(const Machine<Real>& m, const MachineFlux<Real>& psi, const Vec2<Real>& i_s) {
  return m.torque_factor * cross(psi.stator, i_s);
}

// d psi / dt in the stationary frame, given the stator current at these fluxes.
template <class Real>
MachineFlux<Real> flux_derivative(const Machine<Real>& m, const MachineFlux<Real>& psi, const Vec2<Real>& i_s,
                                  const Vec2<Real>& voltage, const Real& electrical_speed) {
  return {voltage - m.R_s * i_s, electrical_speed * quarter_turn(psi.rotor) - m.R_r * rotor_current(m, psi)};
}

}  // namespace slipbench
