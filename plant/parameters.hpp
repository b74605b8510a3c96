// The machine as numbers: per-phase star equivalent circuit in T form, rotor referred to the stator, and its nameplate.
// SI units. Inverse-gamma and gamma circuits are T circuits with one leakage zero; the conversions are here.
#pragma once

#include "plant/math/fields.hpp"

namespace slipbench {

template <class Real>
struct Circuit {
  Real pole_pairs{};
  Real stator_resistance{}, rotor_resistance{};                      // ohm
  Real stator_leakage{}, rotor_leakage{}, magnetizing_inductance{};  // H
  SLIPBENCH_FIELDS(pole_pairs, stator_resistance, rotor_resistance, stator_leakage, rotor_leakage,
                   magnetizing_inductance)

  [[nodiscard]] Real stator_inductance() const { return stator_leakage + magnetizing_inductance; }  // L_s
  [[nodiscard]] Real rotor_inductance() const { return rotor_leakage + magnetizing_inductance; }    // L_r
};

struct Nameplate {
  double power_W{}, line_voltage_V{}, current_A{}, frequency_Hz{}, speed_rpm{}, torque_Nm{};  // rms, line to line
  double power_factor{}, efficiency{};                                                        // 0: not given

  [[nodiscard]] double speed_rad_s() const { return speed_rpm * (3.14159265358979323846 / 30.0); }
  [[nodiscard]] double angular_frequency() const { return frequency_Hz * (2.0 * 3.14159265358979323846); }
  [[nodiscard]] double phase_peak_V() const { return line_voltage_V * 0.81649658092772603273; }  // sqrt(2/3)
  [[nodiscard]] double peak_current_A() const { return current_A * 1.41421356237309504880; }
};

// Inverse-gamma equivalent: all leakage on the stator side. With g = L_m / L_r:
//   L_M = g L_m, L_sigma = L_s - L_M (= sigma L_s), R_R = g^2 R_r, alpha = R_R / L_M = R_r / L_r, psi_R = g psi_r.
// Source: G.R. Slemon, "Modelling of induction machines for electric drives", IEEE Trans. Ind. Appl. 25(6), 1989.
template <class Real>
struct InverseGamma {
  Real pole_pairs{};
  Real stator_resistance{}, rotor_resistance{};  // R_s, R_R, ohm
  Real leakage{}, magnetizing_inductance{};      // L_sigma, L_M, H
  Real flux_ratio{};                             // g: psi_R = g psi_r of the T circuit
  SLIPBENCH_FIELDS(pole_pairs, stator_resistance, rotor_resistance, leakage, magnetizing_inductance, flux_ratio)
};

template <class Real>
InverseGamma<Real> to_inverse_gamma(const Circuit<Real>& c) {
  const Real g = c.magnetizing_inductance / c.rotor_inductance();
  const Real big_m = g * c.magnetizing_inductance;
  return {c.pole_pairs, c.stator_resistance, g * g * c.rotor_resistance, c.stator_inductance() - big_m, big_m, g};
}

// The T circuits that an inverse-gamma (L_r = L_m) and a gamma circuit (L_s = L_m) are. Exact; rotor quantities are
// then those of that circuit, scaled against another T form by its turns ratio.
inline Circuit<double> from_inverse_gamma(double pole_pairs, double R_s, double R_R, double L_sigma, double L_M) {
  return {pole_pairs, R_s, R_R, L_sigma, 0.0, L_M};
}
inline Circuit<double> from_gamma(double pole_pairs, double R_s, double R_R, double L_leak, double L_M) {
  return {pole_pairs, R_s, R_R, 0.0, L_leak, L_M};
}

}  // namespace slipbench
