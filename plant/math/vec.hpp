// Space vectors and small fixed matrices over any number type. Every sum is written in one order, so that a pack of
// lanes gives the same bits as a scalar.
#pragma once

#include <array>
#include <cstddef>

#include "plant/math/fields.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

// A space vector x + j y: (alpha, beta) in the stationary frame, (d, q) in a rotating one. Amplitude-invariant.
template <class Real>
struct Vec2 {
  Real x{}, y{};
  SLIPBENCH_FIELDS(x, y)

  friend Vec2 operator+(const Vec2& a, const Vec2& b) { return {a.x + b.x, a.y + b.y}; }
  friend Vec2 operator-(const Vec2& a, const Vec2& b) { return {a.x - b.x, a.y - b.y}; }
  friend Vec2 operator-(const Vec2& a) { return {-a.x, -a.y}; }
  friend Vec2 operator*(const Real& k, const Vec2& a) { return {k * a.x, k * a.y}; }
};

// j a: a turned by a quarter.
template <class Real>
inline Vec2<Real> quarter_turn(const Vec2<Real>& a) {
  return {-a.y, a.x};
}
// Complex product a b.
template <class Real>
inline Vec2<Real> product(const Vec2<Real>& a, const Vec2<Real>& b) {
  return {a.x * b.x - a.y * b.y, a.x * b.y + a.y * b.x};
}
// conj(a) b: b as seen from a frame that points along a (times |a|).
template <class Real>
inline Vec2<Real> seen_from(const Vec2<Real>& a, const Vec2<Real>& b) {
  return {a.x * b.x + a.y * b.y, a.x * b.y - a.y * b.x};
}
// Re(conj(a) b) and Im(conj(a) b).
template <class Real>
inline Real dot(const Vec2<Real>& a, const Vec2<Real>& b) {
  return a.x * b.x + a.y * b.y;
}
template <class Real>
inline Real cross(const Vec2<Real>& a, const Vec2<Real>& b) {
  return a.x * b.y - a.y * b.x;
}
template <class Real>
inline Real magnitude(const Vec2<Real>& a) {
  return sqrt(a.x * a.x + a.y * a.y);
}
template <class Real>
inline Vec2<Real> select(const MaskOf<Real>& mask, const Vec2<Real>& yes, const Vec2<Real>& no) {
  return {select(mask, yes.x, no.x), select(mask, yes.y, no.y)};
}

// Dense N x M matrix, row by row: m[row][column].
template <class Real, std::size_t N, std::size_t M>
using Mat = std::array<std::array<Real, M>, N>;

}  // namespace slipbench
