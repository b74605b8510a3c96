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
  Real dead_share{};   // t_d f_sw, of the DC link
  Real device_drop{};  // V
  Real per_width{};    // 1 / i_0, 1/A
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

// Clarke's transform of the leg errors straight from the current vector, the weights folded into the sizes: the same up to
// rounding, in half the chain of operations. A stepper evaluates it at every stage.
template <class Real>
struct LegPull {
  Real a_x{}, b_x{}, c_x{}, b_y{}, c_y{};
  SLIPBENCH_FIELDS(a_x, b_x, c_x, b_y, c_y)
};
template <class Real>
LegPull<Real> leg_pull(const Phases<Real>& size) {
  const Real third(1.0 / 3.0), inv_sqrt3(0.57735026918962576451);
  return {Real(2.0) * third * size.a, third * size.b, third * size.c, inv_sqrt3 * size.b, inv_sqrt3 * size.c};
}
template <class Real>
Vec2<Real> leg_error_vector(const LegError<Real>& e, const LegPull<Real>& pull, const Vec2<Real>& current) {
  const Real along = Real(-0.5) * e.per_width * current.x,
             across = Real(0.86602540378443864676) * e.per_width * current.y;
  const Real a = sat(e.per_width * current.x), b = sat(along + across), c = sat(along - across);
  return {(pull.b_x * b + pull.c_x * c) - pull.a_x * a, pull.c_y * c - pull.b_y * b};
}

// Mean stator voltage including the leg errors.
template <class Real>
Vec2<Real> averaged_voltage(const LegError<Real>& e, const Phases<Real>& current, const Phases<Real>& duty,
                            const Real& dc_link) {
  return applied_voltage(duty, dc_link) + clarke(leg_errors(e, current, duty, dc_link));
}

}  // namespace slipbench
