// Clarke and Park transforms, amplitude-invariant (a space vector's length is the peak of a phase quantity).
//
//   x_alpha = (2 x_a - x_b - x_c) / 3,  x_beta = (x_b - x_c) / sqrt 3      (zero sequence dropped)
//   Park: x_dq = x_alphabeta e^{-j angle}
#pragma once

#include "plant/math/vec.hpp"

namespace slipbench {

template <class Real>
struct Phases {
  Real a{}, b{}, c{};
  SLIPBENCH_FIELDS(a, b, c)
};

template <class Real>
inline Vec2<Real> clarke(const Phases<Real>& x) {
  const Real third(1.0 / 3.0), inv_sqrt3(0.57735026918962576451);
  return {third * (Real(2.0) * x.a - x.b - x.c), inv_sqrt3 * (x.b - x.c)};
}
// Two sensors, currents summing to zero: x_c = -x_a - x_b.
template <class Real>
inline Vec2<Real> clarke_two(const Real& a, const Real& b) {
  const Real inv_sqrt3(0.57735026918962576451);
  return {a, inv_sqrt3 * (a + Real(2.0) * b)};
}
template <class Real>
inline Phases<Real> phases_of(const Vec2<Real>& x) {
  const Real half(0.5), half_sqrt3(0.86602540378443864676);
  return {x.x, half_sqrt3 * x.y - half * x.x, -half * x.x - half_sqrt3 * x.y};
}

// Sine and cosine of one angle, kept together.
template <class Real>
struct SinCos {
  Real sin{}, cos{};
  SLIPBENCH_FIELDS(sin, cos)
};
// Turns `x` forward by the angle (rotating to stationary), or back (Park).
template <class Real>
inline Vec2<Real> turn_forward(const SinCos<Real>& angle, const Vec2<Real>& x) {
  return {angle.cos * x.x - angle.sin * x.y, angle.sin * x.x + angle.cos * x.y};
}
template <class Real>
inline Vec2<Real> turn_back(const SinCos<Real>& angle, const Vec2<Real>& x) {
  return {angle.cos * x.x + angle.sin * x.y, angle.cos * x.y - angle.sin * x.x};
}

}  // namespace slipbench
