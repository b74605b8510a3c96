// Where the rotor flux lies: the current model of the rotor, or an estimator's flux (direct orientation).
//
//   d psi_r/dt = (L_m i_s - psi_r) / tau_r + j p w_m psi_r                              (stationary frame)
//   written along its own flux:  d psi/dt = (L_m i_d - psi) / tau_r,  d angle/dt = p w_m + w_slip,
//   w_slip = R_r L_m i_q / (L_r psi): indirect orientation with measured currents, but without a division at psi = 0.
//
// Over one period T, exact for currents that run straight in the rotor's frame and a speed that runs straight in
// time, so that flux and angle refer to tick k itself:
//   psi(k) = e^{j p w_mean T} (a psi(k-1) + b_before i(k-1)) + b_now i(k) + c,  a = e^{-T/tau_r}
//   b_now = L_m (1 - (1 - a) tau_r/T),  b_before = L_m (1 - a) - b_now
// The inverter's voltage u stands still over the period while the flux turns, so the current bows away from the
// straight line: its mean is off by j w_s u T^2 / (12 L_sigma); c = L_m (1 - a) times that. Left out, it would turn
// the frame by about 0.04 degrees at 50 Hz and T = 100 us, and lower the flux by 0.2 %.
//
// psi_r Wb (peak), i A (peak), w_m mechanical rad/s, w_s stator frequency rad/s, tau_r = L_r / R_r s, p pole pairs.
// Source: F. Blaschke, Siemens-Rev. 34, 1972, 217-220; K. Hasse, dissertation, TH Darmstadt, 1969 (from memory);
// discretisation derived here.
#pragma once

#include "controllers/control.hpp"

namespace slipbench {

template <class Real>
struct OrientationConstants {
  Real keep{}, before{}, now{};         // a, b_before, b_now
  Real bow{};                           // L_m (1 - a) T^2 / (12 L_sigma)
  Real pole_pairs{}, half_turn_time{};  // p, p T / 2
  Real slip_gain{};                     // R_r L_m / L_r
  Real flux_floor{};                    // smallest flux that is divided by, Wb
  Real direct{};                        // 1: flux and angle from an estimator
  SLIPBENCH_FIELDS(keep, before, now, bow, pole_pairs, half_turn_time, slip_gain, flux_floor, direct)
};

template <class Real>
struct OrientationState {
  Vec2<Real> rotor_flux;  // stationary frame, Wb
  Vec2<Real> current;     // i(k-1), A
  Real speed{};           // w_m(k-1)
  Real stator_frequency{};
  SLIPBENCH_FIELDS(rotor_flux, current, speed, stator_frequency)
};

// The rotating frame at tick k.
template <class Real>
struct RotorFrame {
  SinCos<Real> angle;       // of the rotor flux
  Real flux{};              // psi, Wb
  Real divisor_flux{};      // psi, held above the floor
  Real electrical_speed{};  // p w_m
  Real stator_frequency{};  // p w_m + w_slip
  Vec2<Real> current;       // i_d, i_q
};

// `applied`: mean stator voltage over [k-1, k) as believed. At the first tick nothing lies behind.
template <class Real>
RotorFrame<Real> orient(OrientationState<Real>& s, const OrientationConstants<Real>& c, const Measurement<Real>& m,
                        const Vec2<Real>& applied, const MaskOf<Real>& first) {
  section<Real>("psi(k) = e^{j p w_mean T} (a psi(k-1) + b_before i(k-1)) + b_now i(k) + bow of the current");
  const SinCos<Real> turned = sincos(c.half_turn_time * (s.speed + m.speed));
  const Vec2<Real> moved = turn_forward(turned, c.keep * s.rotor_flux + c.before * s.current) + c.now * m.current +
                           (c.bow * s.stator_frequency) * quarter_turn(applied);
  s.rotor_flux = select(first, s.rotor_flux, moved);
  s.current = m.current;
  s.speed = m.speed;

  label_alpha_beta("psi", s.rotor_flux);

  section<Real>("frame: direction of the flux (the model's, or an estimator's), currents seen from it");
  const Real tiny(1e-9), zero(0.0), one(1.0);
  const Real modelled = magnitude(s.rotor_flux), per_flux = one / max(modelled, tiny);
  const MaskOf<Real> lost = modelled < tiny;
  const SinCos<Real> model_angle{select(lost, zero, s.rotor_flux.y * per_flux),
                                 select(lost, one, s.rotor_flux.x * per_flux)};
  const SinCos<Real> given_angle = sincos(m.rotor_flux_angle);
  const MaskOf<Real> direct = c.direct > Real(0.5);

  RotorFrame<Real> f;
  f.angle = {select(direct, given_angle.sin, model_angle.sin), select(direct, given_angle.cos, model_angle.cos)};
  f.flux = select(direct, m.rotor_flux, modelled);
  f.divisor_flux = max(f.flux, c.flux_floor);
  f.current = turn_back(f.angle, m.current);
  label("frame_sin", f.angle.sin);
  label("frame_cos", f.angle.cos);
  label("psi_length", f.flux);
  label("psi_divisor", f.divisor_flux);
  label_d_q("i", f.current);
  SLIPBENCH_LABEL(per_flux, lost)
  section<Real>("w_s = p w_m + R_r L_m i_q / (L_r psi)");
  f.electrical_speed = c.pole_pairs * m.speed;
  f.stator_frequency = f.electrical_speed + c.slip_gain * f.current.y / f.divisor_flux;
  s.stator_frequency = f.stator_frequency;
  label("electrical_speed", f.electrical_speed);
  label("w_s", f.stator_frequency);
  return f;
}

}  // namespace slipbench
