// Taylor<Base, K>: a truncated power series in time, carried through every operation.
//
//   x(t) = x_0 + x_1 t + ... + x_K t^K        x_k = x^(k)(0) / k!
//   (a b)_k = sum_j a_j b_{k-j},   (a / b)_k = (a_k - sum_{j>0} b_j (a / b)_{k-j}) / b_0,   sqrt, exp, ... by their recurrences
//
// Base is any number type, as a rule double, or Dual for the series' derivatives by where it starts: one level of each serves where
// nested dual numbers would double the work with every derivative. Comparisons look at the leading coefficient alone; `select` takes whole
// series. floor is a constant; fabs keeps the side of x_0 (+ at 0); sqrt of a series that starts at 0 is 0, where it has no series.
// Source: A. Griewank, A. Walther, "Evaluating Derivatives", 2nd ed. 2008, ch. 13 (recurrences; from memory).
#pragma once

#include <array>
#include <cstddef>
#include <type_traits>

#include "plant/math/elementary.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

template <class Base, std::size_t K>
struct Taylor {
  using Mask = MaskOf<Base>;
  using Count = CountOf<Base>;
  using Scalar = ScalarOf<Base>;

  std::array<Base, K + 1> at{};  // coefficient of t^k

  Taylor() = default;
  explicit Taylor(double constant) { at[0] = Base(constant); }
  explicit Taylor(const Base& constant) requires(!std::is_same_v<Base, double>) { at[0] = constant; }
  // start + t.
  static Taylor time(const Base& start) {
    Taylor x;
    x.at[0] = start;
    if constexpr (K > 0) x.at[1] = Base(1.0);
    return x;
  }

  friend Taylor operator+(const Taylor& a, const Taylor& b) {
    return each([&](std::size_t k) { return a.at[k] + b.at[k]; });
  }
  friend Taylor operator-(const Taylor& a, const Taylor& b) {
    return each([&](std::size_t k) { return a.at[k] - b.at[k]; });
  }
  friend Taylor operator-(const Taylor& a) {
    return each([&](std::size_t k) { return -a.at[k]; });
  }
  friend Taylor operator*(const Taylor& a, const Taylor& b) {
    return each([&](std::size_t k) {
      Base sum = a.at[0] * b.at[k];
      for (std::size_t j = 1; j <= k; ++j) sum = sum + a.at[j] * b.at[k - j];
      return sum;
    });
  }
  friend Taylor operator/(const Taylor& a, const Taylor& b) {
    Taylor q;
    for (std::size_t k = 0; k <= K; ++k) {
      Base rest = a.at[k];
      for (std::size_t j = 1; j <= k; ++j) rest = rest - b.at[j] * q.at[k - j];
      q.at[k] = rest / b.at[0];
    }
    return q;
  }
  friend Mask operator<(const Taylor& a, const Taylor& b) { return a.at[0] < b.at[0]; }
  friend Mask operator<=(const Taylor& a, const Taylor& b) { return a.at[0] <= b.at[0]; }
  friend Mask operator>(const Taylor& a, const Taylor& b) { return a.at[0] > b.at[0]; }
  friend Mask operator>=(const Taylor& a, const Taylor& b) { return a.at[0] >= b.at[0]; }
  friend Mask operator==(const Taylor& a, const Taylor& b) { return a.at[0] == b.at[0]; }
  friend Mask operator!=(const Taylor& a, const Taylor& b) { return a.at[0] != b.at[0]; }
  friend Taylor select(const Mask& mask, const Taylor& yes, const Taylor& no) {
    return each([&](std::size_t k) { return select(mask, yes.at[k], no.at[k]); });
  }
  friend Taylor sqrt(const Taylor& a) {
    const Base root = sqrt(a.at[0]), zero(0.0);
    const auto at_zero = root == zero;
    const Base per_twice = select(at_zero, zero, Base(0.5) / select(at_zero, Base(1.0), root));
    Taylor r;
    r.at[0] = root;
    for (std::size_t k = 1; k <= K; ++k) {
      Base rest = a.at[k];
      for (std::size_t j = 1; j < k; ++j) rest = rest - r.at[j] * r.at[k - j];
      r.at[k] = rest * per_twice;
    }
    return r;
  }
  friend Taylor floor(const Taylor& a) { return Taylor(floor(a.at[0]), Leading{}); }
  friend Taylor fabs(const Taylor& a) {
    const Base side = sign(a.at[0]);
    return each([&](std::size_t k) { return side * a.at[k]; });
  }

  // k-th coefficient of the integral of a' b: (1 / k) sum_{j>0} j a_j b_{k-j}, the core of all that follow.
  static Base integral(std::size_t k, const Taylor& a, const Taylor& b) {
    Base sum(0.0);
    for (std::size_t j = 1; j <= k; ++j) sum = sum + Base(static_cast<double>(j)) * a.at[j] * b.at[k - j];
    return sum * Base(1.0 / static_cast<double>(k));
  }
  template <class F>
  static Taylor each(F coefficient) {
    Taylor x;
    for (std::size_t k = 0; k <= K; ++k) x.at[k] = coefficient(k);
    return x;
  }

 private:
  struct Leading {};
  Taylor(const Base& leading, Leading) { at[0] = leading; }
};

template <class Base, std::size_t K>
Taylor<Base, K> exp(const Taylor<Base, K>& x) {  // e' = e x'
  Taylor<Base, K> e;
  e.at[0] = exp(x.at[0]);
  for (std::size_t k = 1; k <= K; ++k) e.at[k] = Taylor<Base, K>::integral(k, x, e);
  return e;
}
template <class Base, std::size_t K>
Taylor<Base, K> log(const Taylor<Base, K>& x) {  // l' x = x'
  Taylor<Base, K> l;
  l.at[0] = log(x.at[0]);
  for (std::size_t k = 1; k <= K; ++k) l.at[k] = (x.at[k] - Taylor<Base, K>::integral(k, l, x)) / x.at[0];
  return l;
}

namespace detail {
template <class Base, std::size_t K>
SinCos<Taylor<Base, K>> sincos_from(const SinCos<Base>& leading, const Taylor<Base, K>& angle_rad) {
  SinCos<Taylor<Base, K>> s;
  s.sin.at[0] = leading.sin;
  s.cos.at[0] = leading.cos;
  for (std::size_t k = 1; k <= K; ++k) {
    s.sin.at[k] = Taylor<Base, K>::integral(k, angle_rad, s.cos);
    s.cos.at[k] = -Taylor<Base, K>::integral(k, angle_rad, s.sin);
  }
  return s;
}
}  // namespace detail

template <class Base, std::size_t K>
SinCos<Taylor<Base, K>> sincos(const Taylor<Base, K>& angle_rad) {
  return detail::sincos_from(sincos(angle_rad.at[0]), angle_rad);
}
template <class Base, std::size_t K>
SinCos<Taylor<Base, K>> sincos_turns(const Taylor<Base, K>& turns) {
  return detail::sincos_from(sincos_turns(turns.at[0]), Taylor<Base, K>(6.28318530717958647693) * turns);
}
// angle' (x^2 + y^2) = x y' - y x'. At the origin, where the angle has no series, a constant.
template <class Base, std::size_t K>
Taylor<Base, K> atan2(const Taylor<Base, K>& y, const Taylor<Base, K>& x) {
  using T = Taylor<Base, K>;
  const T size2 = x * x + y * y;
  const Base zero(0.0), one(1.0);
  const auto nowhere = size2.at[0] == zero;
  const Base per = select(nowhere, zero, one / select(nowhere, one, size2.at[0]));
  T angle;
  angle.at[0] = atan2(y.at[0], x.at[0]);
  for (std::size_t k = 1; k <= K; ++k)
    angle.at[k] = (T::integral(k, y, x) - T::integral(k, x, y) - T::integral(k, angle, size2)) * per;
  return angle;
}
template <class Base, std::size_t K>
Taylor<Base, K> wrap_angle(const Taylor<Base, K>& angle_rad) {
  Taylor<Base, K> wrapped = angle_rad;
  wrapped.at[0] = wrap_angle(angle_rad.at[0]);
  return wrapped;
}

// Series of the solution of x' = f(x), x(0) = start: each round of f gives the next coefficient, x_{k+1} = f(x)_k / (k + 1).
template <std::size_t K, class Base, std::size_t N, class F>
std::array<Taylor<Base, K>, N> series_of_solution(const F& f, const std::array<Base, N>& start) {
  std::array<Taylor<Base, K>, N> x{};
  for (std::size_t i = 0; i < N; ++i) x[i].at[0] = start[i];
  for (std::size_t k = 0; k < K; ++k) {
    const std::array<Taylor<Base, K>, N> rate = f(x);
    for (std::size_t i = 0; i < N; ++i) x[i].at[k + 1] = rate[i].at[k] * Base(1.0 / static_cast<double>(k + 1));
  }
  return x;
}

}  // namespace slipbench
