// The number types' common ground: what `double` and `float` bring so that a model written once over `Real`
// reads the same for them, for packs of lanes, for dual numbers and for symbols.
//
// Every number type gives: + - * /, unary -, comparisons that yield its Mask, explicit construction from double,
// and the functions select, sqrt, floor, fabs found beside it. No mixed arithmetic: `2.0 * x` compiles for `double`
// alone, so a step writes `Real(2.0) * x`. Both arms of a `select` are always computed: guard roots and divisors.
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <limits>

namespace slipbench {

// Traits of a number type: Mask (result of a comparison), Count (integer partner), and the plain type underneath.
template <class Real>
struct number {
  using Mask = typename Real::Mask;
  using Count = typename Real::Count;
  using Scalar = typename Real::Scalar;
};
template <>
struct number<double> {
  using Mask = bool;
  using Count = std::int64_t;
  using Scalar = double;
};
template <>
struct number<float> {
  using Mask = bool;
  using Count = std::int32_t;
  using Scalar = float;
};

template <class Real>
using MaskOf = typename number<Real>::Mask;
template <class Real>
using CountOf = typename number<Real>::Count;
template <class Real>
using ScalarOf = typename number<Real>::Scalar;

// Lanes side by side in a number, and one of them: what packs (lanes.hpp) have many of.
template <class Real>
inline constexpr std::size_t width_of = 1;
inline double lane_of(double x, std::size_t) { return x; }
inline bool lane_of(bool mask, std::size_t) { return mask; }
inline void set_lane(double& x, std::size_t, double value) { x = value; }
inline bool any(bool mask) { return mask; }

// True where it is known that a select by this mask takes `no` in every lane: then a step may leave the `yes` arm out, to the
// same bits. A number type that cannot tell, such as a symbol, keeps the select.
template <class Mask>
constexpr bool surely_none(const Mask&) {
  return false;
}
inline bool surely_none(bool mask) { return !mask; }

inline double select(bool mask, double yes, double no) { return mask ? yes : no; }
inline float select(bool mask, float yes, float no) { return mask ? yes : no; }
inline double sqrt(double x) { return std::sqrt(x); }
inline float sqrt(float x) { return std::sqrt(x); }
inline double floor(double x) { return std::floor(x); }
inline float floor(float x) { return std::floor(x); }
inline double fabs(double x) { return std::fabs(x); }
inline float fabs(float x) { return std::fabs(x); }

// min(a, b) = select(b < a, b, a) for every type, so that a NaN behaves the same everywhere: min(NaN, b) is NaN.
template <class Real>
inline Real min(const Real& a, const Real& b) {
  return select(b < a, b, a);
}
template <class Real>
inline Real max(const Real& a, const Real& b) {
  return select(a < b, b, a);
}
template <class Real>
inline Real clamp(const Real& x, const Real& low, const Real& high) {
  return min(max(x, low), high);
}
// sat(x): x limited to [-1, 1].
template <class Real>
inline Real sat(const Real& x) {
  return clamp(x, Real(-1.0), Real(1.0));
}
// +1 for x >= 0, -1 below.
template <class Real>
inline Real sign(const Real& x) {
  return select(x < Real(0.0), Real(-1.0), Real(1.0));
}
template <class Real>
inline Real square(const Real& x) {
  return x * x;
}
// True where x is neither infinite nor NaN: test before clamping, or a clamp hides a divergence.
template <class Real>
inline MaskOf<Real> is_finite(const Real& x) {
  return x - x == Real(0.0);
}

}  // namespace slipbench
