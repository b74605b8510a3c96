// Stator current and rotor flux observed by a linear observer, speed measured; stationary frame, gains scheduled over speed.
//
//   L_sigma di/dt = u - R i + (1/tau_r - j w_r) g psi        R = R_s + g^2 R_r, g = L_m / L_r
//         dpsi/dt = L_m / tau_r i - (1/tau_r - j w_r) psi
//   x-(k) = e^(A(w_r) T) x(k-1) + held voltage,   x(k) = x-(k) + M(|w_r|) (i(k) - i-(k))
//
// The machine at a known speed is linear. The exponential is its series to the sixth power: what is left out is (|A| T)^7 / 5040
// of the state, 2e-12 at 90 Hz and 100 us. M holds two complex gains (the machine looks the same from every direction, so
// a gain does too); at negative speeds their conjugates. psi rotor flux psi_r of the T circuit Wb, i A, u V (mean over the
// period, standing still), w_r electrical rad/s, the mean of its values at both ends of the period, T s.
// Source: D.G. Luenberger, IEEE TAC 16, 1971; how M is found: plant/linear/current_loop.hpp.
#pragma once

#include "plant/math/labels.hpp"
#include "plant/math/schedule.hpp"
#include "plant/math/vec.hpp"
#include "plant/parameters.hpp"

namespace slipbench {

template <class Real>
struct CurrentFlux {
  Vec2<Real> current, flux;
  SLIPBENCH_FIELDS(current, flux)

  friend CurrentFlux operator+(const CurrentFlux& a, const CurrentFlux& b) {
    return {a.current + b.current, a.flux + b.flux};
  }
  friend CurrentFlux operator*(const Real& k, const CurrentFlux& a) { return {k * a.current, k * a.flux}; }
};

template <class Real>
struct CurrentFluxModel {
  Real resistance{}, per_leakage{};                // R, 1 / L_sigma
  Real flux_ratio{}, rotor_rate{}, magnetizing{};  // g, 1 / tau_r, L_m
  Real period{};                                   // T
  SLIPBENCH_FIELDS(resistance, per_leakage, flux_ratio, rotor_rate, magnetizing, period)
};

inline CurrentFluxModel<double> current_flux_model(const Circuit<double>& circuit, double period_s) {
  const InverseGamma<double> c = to_inverse_gamma(circuit);
  return {c.stator_resistance + c.rotor_resistance,
          1.0 / c.leakage,
          c.flux_ratio,
          circuit.rotor_resistance / circuit.rotor_inductance(),
          circuit.magnetizing_inductance,
          period_s};
}

// A(w_r) x: the equations without voltage.
template <class Real>
CurrentFlux<Real> unforced(const CurrentFluxModel<Real>& m, const CurrentFlux<Real>& x, const Real& w_r) {
  const Vec2<Real> decay = m.rotor_rate * x.flux - w_r * quarter_turn(x.flux);
  return {m.per_leakage * (m.flux_ratio * decay - m.resistance * x.current),
          (m.magnetizing * m.rotor_rate) * x.current - decay};
}

template <class Real>
CurrentFlux<Real> period_ahead(const CurrentFluxModel<Real>& m, const CurrentFlux<Real>& x, const Vec2<Real>& voltage,
                               const Real& w_r) {
  section<Real>("L_sigma di/dt = u - R i + (1/tau_r - j w_r) g psi,  dpsi/dt = L_m/tau_r i - (1/tau_r - j w_r) psi");
  CurrentFlux<Real> term = unforced(m, x, w_r);
  term.current = term.current + m.per_leakage * voltage;
  label_alpha_beta("di_dt", term.current);
  label_alpha_beta("dpsi_dt", term.flux);
  section<Real>("state a period ahead: the exponential's series to the sixth power of T");
  CurrentFlux<Real> sum = x;
  for (int n = 1; n <= 6; ++n) {
    term = (m.period * Real(1.0 / n)) * term;
    label_alpha_beta("i_term", term.current);
    label_alpha_beta("psi_term", term.flux);
    sum = sum + term;
    if (n < 6) term = unforced(m, term, w_r);
  }
  label_alpha_beta("i_ahead", sum.current);
  label_alpha_beta("psi_ahead", sum.flux);
  return sum;
}

template <class Real>
struct ObserverConstants {
  CurrentFluxModel<Real> model;
  Schedule<Real, 4> gain;  // over |w_r|: real and imaginary part for the current (1), for the flux (H)
  SLIPBENCH_FIELDS(model, gain)
};

template <class Real>
struct ObserverState {
  CurrentFlux<Real> x;
  Real speed{};  // w_r(k-1)
  SLIPBENCH_FIELDS(x, speed)
};

// `voltage`: mean over [k-1, k) as believed. At the first sample nothing lies behind: current as measured, flux as begun.
template <class Real>
void observe(ObserverState<Real>& s, const ObserverConstants<Real>& c, const Vec2<Real>& voltage,
             const Vec2<Real>& current, const Real& w_r, const MaskOf<Real>& first) {
  section<Real>("w_r: mean of its values at both ends of the period");
  const Real w = Real(0.5) * (s.speed + w_r), turn = sign(w);
  label("w_r_mean", w);
  label("w_r_sign", turn);
  const CurrentFlux<Real> ahead = period_ahead(c.model, s.x, voltage, w);
  section<Real>("M at |w_r|: straight lines between the points");
  const std::array<Real, 4> gain = at(c.gain, fabs(w));
  label_each("M", &gain[0], gain.size());
  section<Real>("x = x- + M (i - i-)");
  const Vec2<Real> wrong = current - ahead.current;
  const Vec2<Real> corrected = ahead.current + product(Vec2<Real>{gain[0], turn * gain[1]}, wrong);
  const Vec2<Real> flux = ahead.flux + product(Vec2<Real>{gain[2], turn * gain[3]}, wrong);
  s.x.current = select(first, current, corrected);
  s.x.flux = select(first, s.x.flux, flux);
  label_alpha_beta("wrong", wrong);
  label_alpha_beta("i_observed", s.x.current);
  label_alpha_beta("psi_observed", s.x.flux);
  s.speed = w_r;
}

}  // namespace slipbench
