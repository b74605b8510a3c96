// Mean error of a two-level inverter leg over a switching period: dead time and device drop against the current.
//
//   error_x = -sat(i_x / i_0) (V_dc t_d f_sw + V_drop),   0 for a leg clamped to a rail in its dead-time part
//
// i_0 is the width of the current's zero crossing over which the sign turns (ripple and snubber charge in a real leg).
// V_drop acts against the current in a clamped leg too. Means over one period; f_sw the switching frequency.
// Source: S.-G. Jeong, M.-H. Park, "The analysis and compensation of dead-time effects in PWM inverters", IEEE Trans.
// Ind. Electron. 38(2), 1991, 108-114.
#pragma once

#include "plant/modulation.hpp"

namespace slipbench {

template <class Real>
struct LegError {
  Real dead_share{};      // t_d f_sw, of the DC link
  Real device_drop{};     // V
  Real per_width{};       // 1 / i_0, 1/A
  SLIPBENCH_FIELDS(dead_share, device_drop, per_width)
};

inline LegError<double> leg_error(double dead_time_s, double switching_frequency_Hz, double device_drop_V,
                                  double zero_current_width_A) {
  return {dead_time_s * switching_frequency_Hz, device_drop_V, 1.0 / zero_current_width_A};
}

// Size of each leg's error, 0 V and up: what a current beyond i_0 takes away. `duty` tells which legs are clamped.
template <class Real>
Phases<Real> leg_error_size(const LegError<Real>& e, const Phases<Real>& duty, const Real& dc_link) {
  const Real zero(0.0), one(1.0), dead = e.dead_share * dc_link;
  const auto one_leg = [&](const Real& d) {
    return select(d <= zero, zero, select(d >= one, zero, dead)) + e.device_drop;
  };
  return {one_leg(duty.a), one_leg(duty.b), one_leg(duty.c)};
}

// Leg error voltages (to the DC mid-point) at these phase currents.
template <class Real>
Phases<Real> leg_errors(const LegError<Real>& e, const Phases<Real>& current, const Phases<Real>& size) {
  const auto one_leg = [&](const Real& i, const Real& v) { return -sat(i * e.per_width) * v; };
  return {one_leg(current.a, size.a), one_leg(current.b, size.b), one_leg(current.c, size.c)};
}
template <class Real>
Phases<Real> leg_errors(const LegError<Real>& e, const Phases<Real>& current, const Phases<Real>& duty,
                        const Real& dc_link) {
  return leg_errors(e, current, leg_error_size(e, duty, dc_link));
}

// Mean stator voltage including the leg errors.
template <class Real>
Vec2<Real> averaged_voltage(const LegError<Real>& e, const Phases<Real>& current, const Phases<Real>& duty,
                            const Real& dc_link) {
  return applied_voltage(duty, dc_link) + clarke(leg_errors(e, current, duty, dc_link));
}

}  // namespace slipbench
