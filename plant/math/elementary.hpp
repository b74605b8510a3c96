// Own sine, cosine, arctangent, exponential and logarithm, written once for every number type: the C library's give
// other bits from one processor to the next, and packed ones other bits than scalar ones.
//
// Argument reduction by splitting constants (Cody and Waite), then near-minimax polynomials of our own (Remez exchange,
// 200-bit arithmetic) in one written order. No branches, no tables. A NaN in gives a NaN out. An ulp is the spacing of
// numbers at the exact result. Names are those of the C library on purpose: call them from inside namespace slipbench,
// or qualified; a using-directive would find the C library's for double.
//
//   function      domain, double      domain, float       error
//   sincos        |angle| <= 1e6 rad  |angle| <= 6000 rad  2 ulp, either result
//   sincos_turns  |turns| <= 2^49     |turns| <= 2^20      2 ulp, either result; the reduction is exact
//   atan2         |x|, |y| <= max/2   the same             2 ulp; (-pi, pi], a zero y counts as +0, atan2(0, 0) = 0
//   exp           all                 all                  1.5 ulp; infinity above the largest number, gradual to 0
//   log           all                 all                  1 ulp; -infinity at 0, NaN below
//   wrap_angle    |angle| <= 1e6 rad  |angle| <= 6000 rad  1.5 ulp of pi; an angle in range is unchanged
//
// Source of the method: W.J. Cody, W. Waite, "Software Manual for the Elementary Functions", 1980.
#pragma once

#include <bit>
#include <cstddef>
#include <type_traits>
#include <utility>

#include "plant/math/frames.hpp"
#include "plant/math/labels.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

// Two primitives that each number type brings. 2^k for a whole k whose power is a normal number; and the exponent e of a
// normal x > 0, 2^e <= x < 2^(e+1). Other arguments give some number, never a trap.
inline double two_to_the(double k) {
  return std::bit_cast<double>(std::bit_cast<std::uint64_t>(k + (0x1p52 + 1023.0)) << 52);
}
inline float two_to_the(float k) {
  return std::bit_cast<float>(std::bit_cast<std::uint32_t>(k + (0x1p23f + 127.0f)) << 23);
}
inline double exponent_of(double x) {
  return std::bit_cast<double>((std::bit_cast<std::uint64_t>(x) >> 52) | 0x4330000000000000u) - (0x1p52 + 1023.0);
}
inline float exponent_of(float x) {
  return std::bit_cast<float>((std::bit_cast<std::uint32_t>(x) >> 23) | 0x4b000000u) - (0x1p23f + 127.0f);
}

namespace detail {

// Leading terms of each series are kept apart in the code; these are the tails. pi/2, pi/4 and ln 2 are split
// into parts of which all but the last end in zeros, so that their product with a whole number of turns is exact.
template <class Scalar>
struct Series;
template <>
struct Series<double> {
  static constexpr double rounder = 0x1.8p52, smallest_scaled = 0x1p-1000, scale_up = 0x1p54, scale_exponent = 54.0;
  static constexpr double half_pi[] = {0x1.921fb544p+0, 0x1.0b4611a6p-34, 0x1.3198a2e037073p-69};
  static constexpr double quarter_pi[] = {0x1.921fb54442d18p-1, 0x1.1a62633145c07p-55};
  static constexpr double ln2[] = {0x1.62e42fefa38p-1, 0x1.ef35793c7673p-45};
  static constexpr double exp_low = -746.0, exp_high = 710.0;
  // sin r = r + r z S(z), cos r = 1 - z/2 + z^2 C(z), z = r^2, |r| <= pi/4
  static constexpr double sin[] = {-0.1666666666666663,   0.008333333333322092,    -0.00019841269829567467,
                                   2.755731361342705e-06, -2.5050746471948202e-08, 1.5896152858597474e-10};
  static constexpr double cos[] = {0.041666666666666595, -0.0013888888888873019, 2.4801587288827235e-05,
                                   -2.7557314172001e-07, 2.0875699821381245e-09, -1.1358482258380002e-11};
  // atan u = u + u z A(z), z = u^2, |u| <= 1/2
  static constexpr double atan[] = {-0.3333333333333298,  0.1999999999990317,    -0.14285714276390785,
                                    0.11111110659828825,  -0.09090896249119725,  0.07692073975409322,
                                    -0.06663811208745984, 0.058583026288566535,  -0.05122021171732029,
                                    0.041865447188695795, -0.027435559398181132, 0.01011725037023058};
  // exp r = 1 + r + r^2 E(r), |r| <= ln2 / 2
  static constexpr double exp[] = {0.5000000000000011,    0.16666666666666413,    0.04166666666653001,
                                   0.008333333333494739,  0.0013888888943675312,  0.00019841269506089192,
                                   2.480149304625353e-05, 2.7557586704005324e-06, 2.7630268973785317e-07,
                                   2.4999992344075847e-08};
  // log((1 + s) / (1 - s)) = 2 s + s z L(z), z = s^2, |s| <= 0.1716
  static constexpr double log[] = {0.6666666666666735,  0.399999999994129,  0.28571428742818605, 0.2222219852544284,
                                   0.18183566983570018, 0.1531397822291484, 0.1479671518957125};
};
template <>
struct Series<float> {
  static constexpr double rounder = 0x1.8p23, smallest_scaled = 0x1p-100, scale_up = 0x1p24, scale_exponent = 24.0;
  static constexpr double half_pi[] = {0x1.922p+0, -0x1.2aep-18, -0x1.deap-31, 0x1.184698p-44};
  static constexpr double quarter_pi[] = {0x1.921fbp-1, 0x1.5110b4p-23};
  static constexpr double ln2[] = {0x1.62e4p-1, 0x1.7f7d1cp-20};
  static constexpr double exp_low = -104.0, exp_high = 89.0;
  static constexpr double sin[] = {-0.16666655242443085, 0.008332159370183945, -0.00019515110761858523};
  static constexpr double cos[] = {0.04166664555668831, -0.00138873141258955, 2.4432953068753704e-05};
  static constexpr double atan[] = {-0.333333283662796,  0.19999489188194275, -0.1427207738161087,
                                    0.10940978676080704, -0.0798405334353447, 0.03872314468026161};
  static constexpr double exp[] = {0.4999999403953552, 0.1666652113199234, 0.04166838899254799, 0.008368727751076221,
                                   0.0013814526610076427};
  static constexpr double log[] = {0.6666677594184875, 0.3997752070426941, 0.298723429441452};
};
template <class Real>
using SeriesOf = Series<ScalarOf<Real>>;

// c[first] + c[first + 2] z^2 + ...: every second coefficient, by Horner's rule in z2 = z^2.
template <std::size_t First, class Real, std::size_t N>
inline Real every_second(const Real& z2, const double (&c)[N]) {
  constexpr std::size_t last = First + (N - 1 - First) / 2 * 2;
  Real sum(c[last]);
  for (std::size_t i = last; i > First; i -= 2) sum = sum * z2 + Real(c[i - 2]);
  return sum;
}
// c[0] + c[1] z + c[2] z^2 + ... in two interleaved chains: half the latency of one.
template <class Real, std::size_t N>
inline Real polynomial(const Real& z, const double (&c)[N]) {
  const Real z2 = z * z;
  return every_second<0>(z2, c) + z * every_second<1>(z2, c);
}

// Nearest whole number, halves to even: adding 1.5 * 2^52 (2^23) leaves no room for a fraction.
template <class Real>
inline Real nearest(const Real& x) {
  const Real rounder(SeriesOf<Real>::rounder);
  return (x + rounder) - rounder;
}

// x - n Scale pi/2 for a whole n, Scale a power of two. Products with all but the last part are exact; what rounding
// drops from a subtraction is carried on.
template <int Scale, class Real>
inline Real reduced(const Real& x, const Real& n) {
  constexpr double scale = Scale;
  const auto& part = SeriesOf<Real>::half_pi;
  const Real first = x - n * Real(scale * part[0]), second = n * Real(scale * part[1]);
  const Real r = first - second, dropped = (first - r) - second;
  if constexpr (std::is_same_v<ScalarOf<Real>, float>) {
    const Real third = n * Real(scale * part[2]), shorter = r - third;
    return shorter - (n * Real(scale * part[3]) - (((r - shorter) - third) + dropped));
  } else {
    return r - (n * Real(scale * part[2]) - dropped);
  }
}

// Sine and cosine of `quarters` pi/2 + r. A whole number n of quarters turns (cos r, sin r) by j^n = a + j d: with h = n/2
// rounded to even, d = n - 2h is 0 for even n and +-1 for odd; a = +-1 by the parity of h for even n, 0 for odd. Products
// with 0 and 1 are exact, and no branch has to be guessed.
template <class Real>
inline SinCos<Real> sincos_quarters(const Real& quarters, const Real& r) {
  using S = SeriesOf<Real>;
  const Real z = r * r, one(1.0), two(2.0), half(0.5);
  const Real sin_r = r + r * (z * polynomial(z, S::sin));
  const Real half_z = half * z, head = one - half_z;
  const Real cos_r = head + (((one - head) - half_z) + z * (z * polynomial(z, S::cos)));
  const Real h = nearest(half * quarters), d = quarters - two * h;
  const Real odd = h - two * nearest(half * h);
  const Real a = (one - d * d) - two * (odd * odd);
  SLIPBENCH_LABEL(z, sin_r, half_z, head, cos_r, h, d, odd, a)
  return {a * sin_r + d * cos_r, a * cos_r - d * sin_r};
}

}  // namespace detail

template <class Real>
inline SinCos<Real> sincos(const Real& angle_rad) {
  const Real quarters = detail::nearest(angle_rad * Real(0.63661977236758134308));
  const Real r = detail::reduced<1>(angle_rad, quarters);
  SLIPBENCH_LABEL(quarters, r)
  return detail::sincos_quarters(quarters, r);
}

template <class Real>
inline SinCos<Real> sincos_turns(const Real& turns) {
  const Real quarters = detail::nearest(Real(4.0) * turns);
  const Real rest = turns - Real(0.25) * quarters;
  return detail::sincos_quarters(quarters, rest * Real(6.28318530717958647693));
}

// With lo <= hi the smaller and larger of |x|, |y|: atan(lo/hi) = pi/4 + atan((lo - hi)/(lo + hi)), the second where
// lo > hi/2 (lo - hi is exact there); then mirrored into its octant: a whole number of pi/4 plus or minus the rest.
template <class Real>
inline Real atan2(const Real& y, const Real& x) {
  using S = detail::SeriesOf<Real>;
  const Real zero(0.0), one(1.0), two(2.0), four(4.0);
  const Real across = fabs(x), up = fabs(y);
  const auto steep = across < up, left = x < zero;
  const Real lo = select(steep, across, up), hi = select(steep, up, across);
  const auto near_diagonal = hi < lo + lo;
  const Real part = select(near_diagonal, lo - hi, lo), whole = select(near_diagonal, lo + hi, hi);
  const Real mirrored = select(steep, -part, part);
  const Real u = select(left, -mirrored, mirrored) / select(whole == zero, one, whole);
  const Real base = select(near_diagonal, one, zero);
  const Real upper = select(steep, two - base, base);
  const Real eighths = select(left, four - upper, upper);
  const Real z = u * u;
  const Real tail = u * (z * detail::polynomial(z, S::atan)) + eighths * Real(S::quarter_pi[1]);
  const Real angle = eighths * Real(S::quarter_pi[0]) + (u + tail);
  SLIPBENCH_LABEL(across, up, steep, left, lo, hi, near_diagonal, part, whole, mirrored, u, base, upper, eighths, z,
                  tail, angle)
  return select(y < zero, -angle, angle);
}

template <class Real>
inline Real exp(const Real& x) {
  using S = detail::SeriesOf<Real>;
  const Real limited = clamp(x, Real(S::exp_low), Real(S::exp_high));
  const Real k = detail::nearest(limited * Real(1.44269504088896340736));
  const Real head = limited - k * Real(S::ln2[0]), tail = k * Real(S::ln2[1]);
  const Real r = head - tail;
  const Real power = Real(1.0) + (r + (r * r) * detail::polynomial(r, S::exp));
  SLIPBENCH_LABEL(limited, k, head, tail, r, power)
  const Real half_k = detail::nearest(k * Real(0.5));  // in two factors: 2^k itself may lie outside the normal numbers
  return power * two_to_the(half_k) * two_to_the(k - half_k);
}

// x = 2^e m, sqrt(1/2) <= m < sqrt 2, f = m - 1, s = f/(2 + f): log m = f - (f^2/2 - s (f^2/2 + s^2 L)).
template <class Real>
inline Real log(const Real& x) {
  using S = detail::SeriesOf<Real>;
  using Limits = std::numeric_limits<double>;
  const Real zero(0.0), one(1.0), two(2.0), half(0.5);
  const auto tiny = x < Real(S::smallest_scaled);
  const Real scaled = select(tiny, x * Real(S::scale_up), x);
  const Real e0 = exponent_of(scaled);
  const Real m0 = (half * scaled) * two_to_the(one - e0);
  const auto high = m0 > Real(1.41421356237309504880);
  const Real f = select(high, half * m0, m0) - one;
  const Real k = select(high, e0 + one, e0) - select(tiny, Real(S::scale_exponent), zero);
  const Real s = f / (two + f), z = s * s, half_f2 = (half * f) * f;
  const Real tail = s * (half_f2 + z * detail::polynomial(z, S::log)) + k * Real(S::ln2[1]);
  const Real y = k * Real(S::ln2[0]) - ((half_f2 - tail) - f);
  SLIPBENCH_LABEL(tiny, scaled, e0, m0, high, f, k, s, z, half_f2, tail, y)
  const Real infinity(Limits::infinity()), nan(Limits::quiet_NaN());
  return select(x > zero, select(x < infinity, y, x), select(x == zero, -infinity, nan));
}

// Angle wrapped to [-pi, pi), pi as rounded to the number type.
template <class Real>
inline Real wrap_angle(const Real& angle_rad) {
  const Real pi(3.14159265358979323846), turn(6.28318530717958647693);
  const Real r = detail::reduced<4>(angle_rad, detail::nearest(angle_rad * Real(0.15915494309189533577)));
  return select(r >= pi, r - turn, select(r < -pi, r + turn, r));
}

}  // namespace slipbench
