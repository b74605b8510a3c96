// Frequency reference: ramp, and stall prevention, which gives way where the current would pass its limit.
//
//   w' = clamp(w_ref - w, +-r) room - w_l y,  room = clamp(5 (1 - |i| / I), 0, 1)
//   y = sgn(i_y) max(|i| - I, 0) / (di/dw_slip)                         excess of slip; g y is taken off at once
//
// `room` acts on what raises the torque alone: braking a driving load stretches the ramp as well as accelerating does. y lowers
// the slip, whichever way the machine turns: i_y > 0 is torque ahead, and less frequency is less of it. Its sign is taken
// straight through zero within a tenth of I. g = 8, less where the delay asks for it: current follows slip with sigma tau_r, and
// g / (sigma tau_r) times the delay is kept below 0.3. w_l = 100 rad/s: slower than that, before the shaft.
//
// w electrical rad/s, r rad/s^2, i A peak, I limit. Source: common practice in voltage/frequency control; derived here.
#pragma once

#include "controllers/control.hpp"

namespace slipbench {

template <class Real>
struct FrequencyRampConstants {
  Real pole_pairs{};
  Real most_step{};           // r T, rad/s
  Real limit{}, per_fifth{};  // I, 5 / I
  Real slip_per_ampere{};     // rad/s per A
  Real give_way{};            // w_l T
  Real at_once{};             // g
  SLIPBENCH_FIELDS(pole_pairs, most_step, limit, per_fifth, slip_per_ampere, give_way, at_once)
};

// `frequency` moves on by one period (`hold`: it waits); returns what is to be taken off at once.
template <class Real>
Real step_frequency(Real& frequency, const FrequencyRampConstants<Real>& c, const Real& speed_reference,
                    const Real& current, const Real& i_y, const MaskOf<Real>& hold) {
  section<Real>("w' = clamp(p w_ref - w, +-r) room - w_l y,  y = sgn(i_y) max(|i| - I, 0) / (di/dw_slip)");
  const Real zero(0.0), one(1.0);
  const Real room = clamp((c.limit - current) * c.per_fifth, zero, one);
  const Real step = clamp(c.pole_pairs * speed_reference - frequency, -c.most_step, c.most_step);
  const Real taken = select(zero < step * i_y, room * step, step);
  const Real excess = sat(Real(2.0) * c.per_fifth * i_y) * c.slip_per_ampere * max(current - c.limit, zero);
  frequency = frequency + select(hold, zero, taken - c.give_way * excess);
  label("ramp_step", step);
  SLIPBENCH_LABEL(room, taken, excess)
  label("frequency", frequency);
  return c.at_once * excess;
}

}  // namespace slipbench
