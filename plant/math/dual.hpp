// Dual<Base, N>: a value with its N first derivatives, carried forward through every operation (exact Jacobians).
//
//   (a, a') + (b, b') = (a + b, a' + b'),   (a, a') (b, b') = (a b, a' b + a b'),   f(a, a') = (f(a), f'(a) a')
//
// Base is any number type: double, float, lanes, another Dual. Comparisons look at the value alone, `select` takes value
// and slopes together. floor has slope 0; fabs the slope of its side (+ at 0); sqrt at 0 slope 0, where it has none.
//
//   auto x = Dual<double, 2>::variable(3.0, 0);   // x_0 = 3, slope (1, 0)
#pragma once

#include <array>
#include <cstddef>
#include <type_traits>

#include "plant/math/elementary.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

template <class Base, std::size_t N>
struct Dual {
  using Mask = MaskOf<Base>;
  using Count = CountOf<Base>;
  using Scalar = ScalarOf<Base>;

  Base value{};
  std::array<Base, N> slope{};

  Dual() = default;
  explicit Dual(double constant) : value(Base(constant)) {}
  explicit Dual(const Base& constant) requires(!std::is_same_v<Base, double>) : value(constant) {}
  // The variable x_index: slope 1 along itself.
  static Dual variable(const Base& value, std::size_t index) {
    Dual x;
    x.value = value;
    x.slope[index] = Base(1.0);
    return x;
  }
  // f(a) with f' = `rate`.
  static Dual chain(const Base& value, const Base& rate, const Dual& a) {
    return each(value, [&](std::size_t i) { return rate * a.slope[i]; });
  }
  template <class F>
  static Dual each(const Base& value, F slope_of) {
    Dual y;
    y.value = value;
    for (std::size_t i = 0; i < N; ++i) y.slope[i] = slope_of(i);
    return y;
  }

  friend Dual operator+(const Dual& a, const Dual& b) {
    return each(a.value + b.value, [&](std::size_t i) { return a.slope[i] + b.slope[i]; });
  }
  friend Dual operator-(const Dual& a, const Dual& b) {
    return each(a.value - b.value, [&](std::size_t i) { return a.slope[i] - b.slope[i]; });
  }
  friend Dual operator*(const Dual& a, const Dual& b) {
    return each(a.value * b.value, [&](std::size_t i) { return a.slope[i] * b.value + a.value * b.slope[i]; });
  }
  friend Dual operator/(const Dual& a, const Dual& b) {
    const Base quotient = a.value / b.value;
    return each(quotient, [&](std::size_t i) { return (a.slope[i] - quotient * b.slope[i]) / b.value; });
  }
  friend Dual operator-(const Dual& a) {
    return each(-a.value, [&](std::size_t i) { return -a.slope[i]; });
  }
  friend Mask operator<(const Dual& a, const Dual& b) { return a.value < b.value; }
  friend Mask operator<=(const Dual& a, const Dual& b) { return a.value <= b.value; }
  friend Mask operator>(const Dual& a, const Dual& b) { return a.value > b.value; }
  friend Mask operator>=(const Dual& a, const Dual& b) { return a.value >= b.value; }
  friend Mask operator==(const Dual& a, const Dual& b) { return a.value == b.value; }
  friend Mask operator!=(const Dual& a, const Dual& b) { return a.value != b.value; }
  friend Dual select(const Mask& mask, const Dual& yes, const Dual& no) {
    return each(select(mask, yes.value, no.value),
                [&](std::size_t i) { return select(mask, yes.slope[i], no.slope[i]); });
  }
  friend Dual sqrt(const Dual& a) {
    const Base root = sqrt(a.value), zero(0.0);
    const auto at_zero = root == zero;
    return chain(root, select(at_zero, zero, Base(0.5) / select(at_zero, Base(1.0), root)), a);
  }
  friend Dual floor(const Dual& a) { return Dual(Whole{}, floor(a.value)); }
  friend Dual fabs(const Dual& a) { return chain(fabs(a.value), sign(a.value), a); }

 private:
  struct Whole {};
  Dual(Whole, const Base& v) : value(v) {}
};

// Elementary functions: those of the base, and their derivatives.
template <class Base, std::size_t N>
SinCos<Dual<Base, N>> sincos(const Dual<Base, N>& angle_rad) {
  const auto s = sincos(angle_rad.value);
  return {Dual<Base, N>::chain(s.sin, s.cos, angle_rad), Dual<Base, N>::chain(s.cos, -s.sin, angle_rad)};
}
template <class Base, std::size_t N>
SinCos<Dual<Base, N>> sincos_turns(const Dual<Base, N>& turns) {
  const auto s = sincos_turns(turns.value);
  const Base turn(6.28318530717958647693);
  return {Dual<Base, N>::chain(s.sin, turn * s.cos, turns), Dual<Base, N>::chain(s.cos, -(turn * s.sin), turns)};
}
// At the origin, where the angle has no derivative, the slope is 0.
template <class Base, std::size_t N>
Dual<Base, N> atan2(const Dual<Base, N>& y, const Dual<Base, N>& x) {
  const Base size2 = x.value * x.value + y.value * y.value, zero(0.0), one(1.0);
  const auto nowhere = size2 == zero;
  const Base per_size2 = select(nowhere, zero, one / select(nowhere, one, size2));
  return Dual<Base, N>::each(atan2(y.value, x.value),
                             [&](std::size_t i) { return (x.value * y.slope[i] - y.value * x.slope[i]) * per_size2; });
}
template <class Base, std::size_t N>
Dual<Base, N> exp(const Dual<Base, N>& x) {
  const Base power = exp(x.value);
  return Dual<Base, N>::chain(power, power, x);
}
template <class Base, std::size_t N>
Dual<Base, N> log(const Dual<Base, N>& x) {
  return Dual<Base, N>::chain(log(x.value), Base(1.0) / x.value, x);
}
template <class Base, std::size_t N>
Dual<Base, N> wrap_angle(const Dual<Base, N>& angle_rad) {
  return Dual<Base, N>::chain(wrap_angle(angle_rad.value), Base(1.0), angle_rad);
}

}  // namespace slipbench
