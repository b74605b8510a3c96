// A machine whose stator flux is held: slip and currents from its torque, exactly as its circuit has them.
//
//   i_s = psi (1 + j Y) / (L_s (1 + j sigma Y)),  Y = w_slip tau_r                        (along the stator flux: x, across: y)
//   T = 3/2 p psi i_y = T_po 2 y / (1 + y^2),  y = sigma Y,  T_po = 3/2 p psi^2 (1 - sigma) / (2 sigma L_s)
//   below pull-out:  y = m / (1 + sqrt(1 - m^2)),  m = T / T_po, held within +-0.95
//   i_x = psi / L_s (1 + sigma Y^2) / (1 + sigma^2 Y^2)
//
// psi stator flux linkage Wb (peak), w_slip electrical rad/s, T N m, sigma = 1 - L_m^2 / (L_s L_r), tau_r = L_r / R_r s.
// Source: stator and rotor voltage equations in the steady state; the torque is Kloss's formula (any text on machines).
#pragma once

#include "controllers/control.hpp"

namespace slipbench {

template <class Real>
struct HeldFluxConstants {
  Real torque_per_flux_current{};  // 3/2 p
  Real per_pull_out{};             // psi^2 / T_po
  Real sigma{}, per_sigma_tau{};   // sigma, 1 / (sigma tau_r)
  Real per_inductance{};           // 1 / L_s
  SLIPBENCH_FIELDS(torque_per_flux_current, per_pull_out, sigma, per_sigma_tau, per_inductance)
};

inline HeldFluxConstants<double> held_flux_of(const Circuit<double>& circuit) {
  const double L_s = circuit.stator_inductance(), L_r = circuit.rotor_inductance();
  const double sigma = 1.0 - square(circuit.magnetizing_inductance) / (L_s * L_r);
  HeldFluxConstants<double> c;
  c.torque_per_flux_current = 1.5 * circuit.pole_pairs;
  c.per_pull_out = 2.0 * sigma * L_s / (c.torque_per_flux_current * (1.0 - sigma));
  c.sigma = sigma;
  c.per_sigma_tau = circuit.rotor_resistance / (sigma * L_r);
  c.per_inductance = 1.0 / L_s;
  return c;
}

template <class Real>
struct LoadPoint {
  Real slip{};          // w_slip, rad/s
  Real i_x_per_flux{};  // i_x / psi, 1/H
};

// `flux2`: psi^2, above zero.
template <class Real>
LoadPoint<Real> load_point(const HeldFluxConstants<Real>& c, const Real& torque, const Real& flux2) {
  section<Real>("slip and i_x from the torque: m = T / T_po,  y = m / (1 + sqrt(1 - m^2))");
  const Real one(1.0), most(0.95);
  const Real m = clamp(torque * c.per_pull_out / flux2, -most, most);
  const Real y = m / (one + sqrt(one - square(m)));
  label("torque_share", m);
  label("slip_share", y);
  return {y * c.per_sigma_tau, c.per_inductance * (c.sigma + square(y)) / (c.sigma * (one + square(y)))};
}

}  // namespace slipbench
