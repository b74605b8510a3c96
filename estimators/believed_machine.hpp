// The machine as an estimator believes it: inverse-gamma circuit, stationary frame, one control period ahead.
//
//   L_sigma di/dt = u - (R_s + R_R) i + (alpha - j w_r) psi
//         dpsi/dt = R_R i - (alpha - j w_r) psi               torque = 3/2 p Im(conj(psi) i)
//
// i stator current A, psi rotor flux linkage psi_R Wb (peak), u V, w_r electrical rotor speed rad/s, alpha =
// R_R / L_M 1/s. The voltage vector stands still over a period, so for a given w_r the equations are linear
// with constant input and the Taylor series x + T f + T^2/2 A f + T^3/6 A^2 f leaves (w T)^4 / 24 of the
// state: 4e-7 at 90 Hz and 100 us.
// Source: G.R. Slemon, IEEE Trans. Ind. Appl. 25(6), 1989 (circuit); the prediction is the exponential's
// series.
#pragma once

#include "estimators/flux_gain.hpp"
#include "estimators/method.hpp"
#include "plant/math/vec.hpp"

namespace slipbench {

template <class Real>
struct BelievedMachine {
  Real pole_pairs{}, R_s{}, R_R{}, alpha{};
  Real L_sigma{}, per_L_sigma{};  // H, 1/H
  Real torque_factor{};           // 3/2 p
  Real per_flux_ratio{};          // psi_r (T circuit) = per_flux_ratio psi_R
  Real period{};                  // T, s
  Real least_flux{};              // psi_R below which direction and speed mean nothing, Wb: 5 % of nominal
  Real per_nominal_flux{};        // 1/Wb
  Real speed_limit{};             // electrical rad/s: three times rated; estimates are held inside
  SLIPBENCH_FIELDS(pole_pairs, R_s, R_R, alpha, L_sigma, per_L_sigma, torque_factor, per_flux_ratio, period, least_flux,
                   per_nominal_flux, speed_limit)
};

BelievedMachine<double> believe(const EstimatorSetup& setup);
// psi_R of the circuit at rated voltage, frequency and speed, Wb.
double nominal_rotor_flux(const EstimatorSetup& setup);
// Share of a step that a first-order low-pass of this corner takes in one period: 1 - e^{-2 pi f T}.
double low_pass_share(double corner_Hz, double period_s);

// Value of a setting: what the scenario gave, else the table's (a table's NaN: the caller's).
struct SettingReader {
  std::span<const Setting> table;
  const Settings& given;
  double operator()(std::string_view name) const;
  double operator()(std::string_view name, double otherwise) const { return given.value(name, otherwise); }
};

// The gain's constants: zeta, stiffness in units of alpha, and the frequency above which damping grows no
// further.
FluxGain<double> flux_gain_for(const EstimatorSetup& setup, double damping, double stiffness, double frequency_cap_Hz);

// Stator current and rotor flux, side by side.
template <class Real>
struct CurrentAndFlux {
  Vec2<Real> current, flux;
  SLIPBENCH_FIELDS(current, flux)

  friend CurrentAndFlux operator+(const CurrentAndFlux& a, const CurrentAndFlux& b) {
    return {a.current + b.current, a.flux + b.flux};
  }
  friend CurrentAndFlux operator*(const Real& k, const CurrentAndFlux& a) { return {k * a.current, k * a.flux}; }
};

// A(w_r) x: the equations without voltage.
template <class Real>
CurrentAndFlux<Real> unforced(const BelievedMachine<Real>& m, const CurrentAndFlux<Real>& x, const Real& w_r) {
  const Vec2<Real> emf = m.R_R * x.current - m.alpha * x.flux + w_r * quarter_turn(x.flux);
  return {-m.per_L_sigma * (m.R_s * x.current + emf), emf};
}

// The state a period later, and the three derivatives it was built from (the Kalman filter's Jacobian reuses
// them).
template <class Real>
struct Ahead {
  CurrentAndFlux<Real> state, first, second, third;
};
template <class Real>
Ahead<Real> ahead(const BelievedMachine<Real>& m, const CurrentAndFlux<Real>& x, const Vec2<Real>& voltage,
                  const Real& w_r) {
  section<Real>("L_sigma di/dt = u - R_s i - dpsi/dt,  dpsi/dt = R_R i - (alpha - j w_r) psi");
  CurrentAndFlux<Real> f = unforced(m, x, w_r);
  f.current = f.current + m.per_L_sigma * voltage;
  label_alpha_beta("di_dt", f.current);
  label_alpha_beta("dpsi_dt", f.flux);
  section<Real>("second and third derivative: f2 = A f, f3 = A f2");
  const CurrentAndFlux<Real> f2 = unforced(m, f, w_r), f3 = unforced(m, f2, w_r);
  const Real third = Real(1.0 / 3.0) * m.period, half = Real(0.5) * m.period;
  label_alpha_beta("f2_i", f2.current);
  label_alpha_beta("f2_psi", f2.flux);
  label_alpha_beta("f3_i", f3.current);
  label_alpha_beta("f3_psi", f3.flux);
  section<Real>("state a period ahead: x + T (f + T/2 (f2 + T/3 f3))");
  const CurrentAndFlux<Real> state = x + m.period * (f + half * (f2 + third * f3));
  label_alpha_beta("i_ahead", state.current);
  label_alpha_beta("psi_ahead", state.flux);
  return {state, f, f2, f3};
}

// Fills the fields that follow from flux, current and electrical speed.
template <class Real>
Estimate<Real> estimate_of(const BelievedMachine<Real>& m, const Vec2<Real>& flux, const Vec2<Real>& current,
                           const Real& w_r) {
  section<Real>("estimates: speed = w_r / p, flux and angle of psi, torque = 3/2 p Im(conj(psi) i)");
  Estimate<Real> out;
  out.speed = w_r / m.pole_pairs;
  const Real length = magnitude(flux);
  label("psi_length", length);
  out.rotor_flux = m.per_flux_ratio * length;
  const Real angle = atan2(flux.y, flux.x), pi(0.5 * rad_per_turn);
  out.rotor_flux_angle = select(angle < pi, angle, -angle);
  out.torque = m.torque_factor * cross(flux, current);
  label("speed_mechanical", out.speed);
  label("angle_atan2", angle);
  label("psi_angle", out.rotor_flux_angle);
  return out;
}

// Share of the nominal flux (full from one half on) times w_s^2 / (w_s^2 + w_1^2), w_1 = 2 pi 0.5 Hz: no
// trust without flux, and less and less towards zero stator frequency, where speed cannot be observed from
// currents.
template <class Real>
Real trust_by_frequency(const BelievedMachine<Real>& m, const Vec2<Real>& flux, const Real& w_s) {
  section<Real>("trust = share of nominal flux times w_s^2 / (w_s^2 + w_1^2)");
  const Real known = min(Real(2.0) * m.per_nominal_flux * magnitude(flux), Real(1.0));
  const Real w_s2 = w_s * w_s;
  SLIPBENCH_LABEL(known, w_s2)
  return known * w_s2 / (w_s2 + Real(0.25 * rad_per_turn * rad_per_turn));
}

}  // namespace slipbench
