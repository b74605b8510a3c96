// Speed controller: PI by the symmetric optimum, reference shaped within the torque there is, limited output.
//
//   w_f' = clamp((w_ref - w_f) / T_f, +-T_limit / J),  e = w_f - w
//   T = k_p e + x + J w_f',  limited to +-T_limit;  x' = k_i (e + (T_limited - T) / k_p)
//   k_p = J w_c,  k_i = k_p / T_i,  w_c = 1 / (a T_sum),  T_i = a^2 T_sum = a / w_c
//
// T_sum: all small lags of the loop, 1/alpha_c (current loop) + (d + 1/2) T (command) + the speed signal's own lag.
// a = 4 by default: phase margin atan((a^2 - 1) / (2 a)) = 62 degrees, since a speed signal carries noise and the
// lags are estimates; a = 2 (37 degrees) is the textbook's fastest. A bandwidth (w_c / 2 pi) that is set gives a =
// 1 / (w_c T_sum) within 2..4. The shaped reference carries its own torque (J w_f'), so that the PI's zero gives no
// overshoot.
//
// w mechanical rad/s, T N m, J kg m^2 (as believed). The integral x is the load torque that the controller believes.
// Source: C. Kessler, "Das symmetrische Optimum", Regelungstechnik 6, 1958, 395-400 and 432-436 (from memory).
#pragma once

#include "controllers/control.hpp"

namespace slipbench {

template <class Real>
struct SpeedConstants {
  Real k_p{}, k_i_period{}, back{};  // N m s, N m per period, 1 / (T_i) T: back-calculation
  Real reference_share{};            // of the way per period, T / T_f
  Real inertia_rate{};               // J / T
  Real per_inertia_rate{};           // T / J
  Real enabled{};                    // 0: torque reference
  SLIPBENCH_FIELDS(k_p, k_i_period, back, reference_share, inertia_rate, per_inertia_rate, enabled)
};

template <class Real>
struct SpeedState {
  Real reference{};  // w_f, rad/s
  Real integral{};   // x, N m
  SLIPBENCH_FIELDS(reference, integral)
};

// Torque reference after limits. `hold`: machine not magnetised yet, the shaped reference waits at the speed there is.
template <class Real>
Real control_speed(SpeedState<Real>& s, const SpeedConstants<Real>& c, const Measurement<Real>& m,
                   const Real& torque_limit, const MaskOf<Real>& hold) {
  section<Real>("shaped reference: w_f' = clamp((w_ref - w_f) / T_f, +-T_limit / J)");
  const Real most = torque_limit * c.per_inertia_rate;
  const Real step = clamp(c.reference_share * (m.speed_reference - s.reference), -most, most);
  const Real before = select(hold, m.speed, s.reference);
  const Real rise = select(hold, Real(0.0), step);
  s.reference = before + rise;

  label("torque_limit", torque_limit);
  label("speed_step", step);
  label("rise", rise);
  label("speed_shaped", s.reference);

  section<Real>("T = k_p e + x + J w_f', limited;  x' = k_i (e + (T_limited - T) / k_p)");
  const Real error = before - m.speed;
  const Real wanted = c.k_p * error + s.integral + c.inertia_rate * rise;
  const Real limited = clamp(wanted, -torque_limit, torque_limit);
  const MaskOf<Real> enabled = c.enabled > Real(0.5);
  const Real integral = s.integral + c.k_i_period * error + c.back * (limited - wanted);
  label("speed_error", error);
  label("torque_wanted", wanted);
  label("torque_limited", limited);
  label("speed_integral", integral);
  s.integral = select(enabled, clamp(integral, -torque_limit, torque_limit), Real(0.0));
  return select(enabled, limited, clamp(m.torque_reference, -torque_limit, torque_limit));
}

}  // namespace slipbench
