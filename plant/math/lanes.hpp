// Lanes<Isa, W>: W doubles side by side, each lane computing the very bits that one double would.
//
//   Isa  instruction set: Sse2, Avx2 or Avx512 (native registers of 16, 32 or 64 bytes)
//   W    lanes, a whole multiple of a register's; kept as W * 8 / bytes registers
//
// Registers are GCC vector extensions: plain operators on them compile to packed IEEE operations in every translation
// unit, and bring no library function with a symbol that two instruction sets could share. The set is part of the type
// for the same reason: code for one set never links against another's. Every operation is exactly rounded or a bit
// operation, so lanes equal scalars bit for bit as long as contraction is off (-ffp-contract=off) and sums have one order.
#pragma once

#include <cstddef>
#include <cstdint>
#include <utility>

#include "plant/math/numbers.hpp"

#if defined(__SSE2__)
#include <immintrin.h>
#endif

#define SLIPBENCH_INLINE __attribute__((always_inline)) inline

namespace slipbench {

struct Sse2 {
  static constexpr std::size_t register_bytes = 16;
};
struct Avx2 {
  static constexpr std::size_t register_bytes = 32;
};
struct Avx512 {
  static constexpr std::size_t register_bytes = 64;
};

namespace detail {

template <class Isa>
struct Registers {
  using Reals [[gnu::vector_size(Isa::register_bytes)]] = double;
  using Whole [[gnu::vector_size(Isa::register_bytes)]] = std::int64_t;
  using Bits [[gnu::vector_size(Isa::register_bytes)]] = std::uint64_t;
  static constexpr std::size_t lanes = Isa::register_bytes / sizeof(double);
};

// Square root and floor have no operator. Without the set's instructions (a unit compiled for less) lane by lane.
template <class Isa, class R = typename Registers<Isa>::Reals>
SLIPBENCH_INLINE R root_of(const R& x) {
#if defined(__SSE2__)
  if constexpr (Isa::register_bytes == 16) return _mm_sqrt_pd(x);
#endif
#if defined(__AVX__)
  if constexpr (Isa::register_bytes == 32) return _mm256_sqrt_pd(x);
#endif
#if defined(__AVX512F__)
  if constexpr (Isa::register_bytes == 64) return _mm512_maskz_sqrt_pd(0xff, x);
#endif
  R y{};
  for (std::size_t i = 0; i < Registers<Isa>::lanes; ++i) y[i] = __builtin_sqrt(x[i]);
  return y;
}
// a < b ? a : b and a > b ? a : b, to the bit the processor's own operation (NaN and signed zeros: the second operand).
template <class Isa, class R = typename Registers<Isa>::Reals>
SLIPBENCH_INLINE R less_of(const R& a, const R& b) {
#if defined(__SSE2__)
  if constexpr (Isa::register_bytes == 16) return _mm_min_pd(a, b);
#endif
#if defined(__AVX__)
  if constexpr (Isa::register_bytes == 32) return _mm256_min_pd(a, b);
#endif
#if defined(__AVX512F__)
  if constexpr (Isa::register_bytes == 64) return _mm512_maskz_min_pd(0xff, a, b);
#endif
  return a < b ? a : b;
}
template <class Isa, class R = typename Registers<Isa>::Reals>
SLIPBENCH_INLINE R more_of(const R& a, const R& b) {
#if defined(__SSE2__)
  if constexpr (Isa::register_bytes == 16) return _mm_max_pd(a, b);
#endif
#if defined(__AVX__)
  if constexpr (Isa::register_bytes == 32) return _mm256_max_pd(a, b);
#endif
#if defined(__AVX512F__)
  if constexpr (Isa::register_bytes == 64) return _mm512_maskz_max_pd(0xff, a, b);
#endif
  return a > b ? a : b;
}
template <class Isa, class R = typename Registers<Isa>::Reals>
SLIPBENCH_INLINE R floor_of(const R& x) {
#if defined(__AVX__)
  if constexpr (Isa::register_bytes == 32) return _mm256_floor_pd(x);
#endif
#if defined(__AVX512F__)
  if constexpr (Isa::register_bytes == 64) return _mm512_maskz_roundscale_pd(0xff, x, 0x09);  // down, quietly
#endif
  // The size's nearest whole number by adding and subtracting 2^52, the sign put back (of a zero, too), then one less where
  // that went up; from 2^52 on every double is whole.
  using Bits = typename Registers<Isa>::Bits;
  const R whole_from = R{} + 0x1p52, one = R{} + 1.0;
  const Bits sign = Bits{} + 0x8000000000000000u;
  const R size = (R)((Bits)x & ~sign);
  const R near = (R)((Bits)((size + whole_from) - whole_from) | ((Bits)x & sign));
  const R down = near - (near > x ? one : R{});
  return size < whole_from ? down : x;
}

template <class Isa, class W = typename Registers<Isa>::Whole>
SLIPBENCH_INLINE bool any_of(const W& mask) {
#if defined(__SSE2__)
  if constexpr (Isa::register_bytes == 16) return _mm_movemask_pd((__m128d)mask) != 0;
#endif
#if defined(__AVX__)
  if constexpr (Isa::register_bytes == 32) return _mm256_movemask_pd((__m256d)mask) != 0;
#endif
#if defined(__AVX512F__)
  if constexpr (Isa::register_bytes == 64) return _mm512_test_epi64_mask((__m512i)mask, (__m512i)mask) != 0;
#endif
  std::int64_t bits = 0;
  for (std::size_t i = 0; i < Registers<Isa>::lanes; ++i) bits |= mask[i];
  return bits != 0;
}

}  // namespace detail

template <class Isa, std::size_t W>
struct LanesMask;
template <class Isa, std::size_t W>
struct LanesCount;
template <class Isa, std::size_t W>
struct Lanes;

template <class Isa, std::size_t W>
inline constexpr std::size_t width_of<Lanes<Isa, W>> = W;

template <class Isa, std::size_t W>
struct Lanes {
  using Register = typename detail::Registers<Isa>::Reals;
  using Bits = typename detail::Registers<Isa>::Bits;
  using Mask = LanesMask<Isa, W>;
  using Count = LanesCount<Isa, W>;
  using Scalar = double;
  static constexpr std::size_t per_register = detail::Registers<Isa>::lanes, width = W, registers = W / per_register;
  static_assert(W % per_register == 0 && W > 0);

  Register
      part[registers];  // not set by default, like a double: zeroing a stepper's memory would cost as much as a stage

  Lanes() = default;
  SLIPBENCH_INLINE explicit Lanes(double x) {
    for (auto& p : part) p = Register{} + x;
  }
  SLIPBENCH_INLINE static Lanes load(const double* from) {
    Lanes x;
    for (std::size_t r = 0; r < registers; ++r) __builtin_memcpy(&x.part[r], from + r * per_register, sizeof(Register));
    return x;
  }
  SLIPBENCH_INLINE void store(double* to) const {
    for (std::size_t r = 0; r < registers; ++r) __builtin_memcpy(to + r * per_register, &part[r], sizeof(Register));
  }
  [[nodiscard]] double get(std::size_t lane) const { return part[lane / per_register][lane % per_register]; }
  void set(std::size_t lane, double x) { part[lane / per_register][lane % per_register] = x; }

  friend double lane_of(const Lanes& x, std::size_t lane) { return x.get(lane); }
  friend void set_lane(Lanes& x, std::size_t lane, double value) { x.set(lane, value); }

  // f(register of each operand) for each register; unrolled by pack expansion, whatever the optimiser's level.
  template <class F, class... Operand>
  SLIPBENCH_INLINE static Lanes each(F f, const Operand&... x) {
    return [&]<std::size_t... I>(std::index_sequence<I...>) __attribute__((always_inline)) {
      Lanes result;
      const auto one = [&](std::size_t i) __attribute__((always_inline)) { result.part[i] = f(x.part[i]...); };
      (one(I), ...);
      return result;
    }
    (std::make_index_sequence<registers>{});
  }

  friend SLIPBENCH_INLINE Lanes operator+(const Lanes& a, const Lanes& b) { return each(plus, a, b); }
  friend SLIPBENCH_INLINE Lanes operator-(const Lanes& a, const Lanes& b) { return each(minus, a, b); }
  friend SLIPBENCH_INLINE Lanes operator*(const Lanes& a, const Lanes& b) { return each(times, a, b); }
  friend SLIPBENCH_INLINE Lanes operator/(const Lanes& a, const Lanes& b) { return each(over, a, b); }
  friend SLIPBENCH_INLINE Lanes operator-(const Lanes& a) { return each(negative, a); }
  friend SLIPBENCH_INLINE Mask operator<(const Lanes& a, const Lanes& b) { return Mask::each(less, a, b); }
  friend SLIPBENCH_INLINE Mask operator<=(const Lanes& a, const Lanes& b) { return Mask::each(less_equal, a, b); }
  friend SLIPBENCH_INLINE Mask operator>(const Lanes& a, const Lanes& b) { return b < a; }
  friend SLIPBENCH_INLINE Mask operator>=(const Lanes& a, const Lanes& b) { return b <= a; }
  friend SLIPBENCH_INLINE Mask operator==(const Lanes& a, const Lanes& b) { return Mask::each(equal, a, b); }
  friend SLIPBENCH_INLINE Mask operator!=(const Lanes& a, const Lanes& b) { return !(a == b); }
  friend SLIPBENCH_INLINE Lanes select(const Mask& mask, const Lanes& yes, const Lanes& no) {
    return each(choice, mask, yes, no);
  }
  // min(a, b) = select(b < a, b, a), max(a, b) = select(a < b, b, a), as numbers.hpp has them.
  friend SLIPBENCH_INLINE Lanes min(const Lanes& a, const Lanes& b) { return each(detail::less_of<Isa>, b, a); }
  friend SLIPBENCH_INLINE Lanes max(const Lanes& a, const Lanes& b) { return each(detail::more_of<Isa>, b, a); }
  friend SLIPBENCH_INLINE Lanes sqrt(const Lanes& a) { return each(detail::root_of<Isa>, a); }
  friend SLIPBENCH_INLINE Lanes floor(const Lanes& a) { return each(detail::floor_of<Isa>, a); }
  friend SLIPBENCH_INLINE Lanes fabs(const Lanes& a) { return each(size, a); }
  friend SLIPBENCH_INLINE Lanes two_to_the(const Lanes& k) { return each(power, k); }
  friend SLIPBENCH_INLINE Lanes exponent_of(const Lanes& a) { return each(exponent, a); }

 private:
  using R = Register;
#define SLIPBENCH_LANE_OP(name, parameters, expression) \
  static constexpr auto name = [] parameters __attribute__((always_inline)) { return expression; };
  SLIPBENCH_LANE_OP(plus, (const R& a, const R& b), a + b)
  SLIPBENCH_LANE_OP(minus, (const R& a, const R& b), a - b)
  SLIPBENCH_LANE_OP(times, (const R& a, const R& b), a* b)
  SLIPBENCH_LANE_OP(over, (const R& a, const R& b), a / b)
  SLIPBENCH_LANE_OP(negative, (const R& a), -a)
  SLIPBENCH_LANE_OP(less, (const R& a, const R& b), a < b)
  SLIPBENCH_LANE_OP(less_equal, (const R& a, const R& b), a <= b)
  SLIPBENCH_LANE_OP(equal, (const R& a, const R& b), a == b)
  SLIPBENCH_LANE_OP(choice, (const auto& m, const R& a, const R& b), m ? a : b)
  SLIPBENCH_LANE_OP(size, (const R& a), (R)((Bits)a&(Bits{} + 0x7fffffffffffffffu)))
  SLIPBENCH_LANE_OP(power, (const R& k), (R)((Bits)(k + (0x1p52 + 1023.0)) << 52))
  SLIPBENCH_LANE_OP(exponent, (const R& a), (R)(((Bits)a >> 52) | (Bits{} + 0x4330000000000000u)) - (0x1p52 + 1023.0))
#undef SLIPBENCH_LANE_OP
};

// What a comparison of lanes gives: all bits of a lane set where it holds.
template <class Isa, std::size_t W>
struct LanesMask {
  using Register = typename detail::Registers<Isa>::Whole;
  static constexpr std::size_t registers = W / detail::Registers<Isa>::lanes;
  Register part[registers] = {};

  LanesMask() = default;
  explicit LanesMask(bool all) {
    for (auto& p : part) p = Register{} - (all ? 1 : 0);
  }
  [[nodiscard]] bool get(std::size_t lane) const {
    constexpr std::size_t per_register = detail::Registers<Isa>::lanes;
    return part[lane / per_register][lane % per_register] != 0;
  }
  friend bool lane_of(const LanesMask& mask, std::size_t lane) { return mask.get(lane); }
  friend SLIPBENCH_INLINE bool any(const LanesMask& mask) {
    Register together = mask.part[0];
    for (std::size_t r = 1; r < registers; ++r) together |= mask.part[r];
    return detail::any_of<Isa>(together);
  }
  friend SLIPBENCH_INLINE bool surely_none(const LanesMask& mask) { return !any(mask); }
  template <class F, class... Operand>
  SLIPBENCH_INLINE static LanesMask each(F f, const Operand&... x) {
    return [&]<std::size_t... I>(std::index_sequence<I...>) __attribute__((always_inline)) {
      LanesMask result;
      const auto one = [&](std::size_t i) __attribute__((always_inline)) { result.part[i] = f(x.part[i]...); };
      (one(I), ...);
      return result;
    }
    (std::make_index_sequence<registers>{});
  }
  friend SLIPBENCH_INLINE LanesMask operator&(const LanesMask& a, const LanesMask& b) {
    return each(
        [](const Register& p, const Register& q) __attribute__((always_inline)) { return p & q; }, a, b);
  }
  friend SLIPBENCH_INLINE LanesMask operator|(const LanesMask& a, const LanesMask& b) {
    return each(
        [](const Register& p, const Register& q) __attribute__((always_inline)) { return p | q; }, a, b);
  }
  friend SLIPBENCH_INLINE LanesMask operator!(const LanesMask& a) {
    return each(
        [](const Register& p) __attribute__((always_inline)) { return ~p; }, a);
  }
};

// The integer partner: W 64-bit whole numbers (encoder counts, ticks).
template <class Isa, std::size_t W>
struct LanesCount {
  using Register = typename detail::Registers<Isa>::Whole;
  static constexpr std::size_t per_register = detail::Registers<Isa>::lanes, registers = W / per_register;
  Register part[registers] = {};

  LanesCount() = default;
  explicit LanesCount(std::int64_t n) {
    for (auto& p : part) p = Register{} + n;
  }
  [[nodiscard]] std::int64_t get(std::size_t lane) const { return part[lane / per_register][lane % per_register]; }
  void set(std::size_t lane, std::int64_t n) { part[lane / per_register][lane % per_register] = n; }

  friend LanesCount operator+(LanesCount a, const LanesCount& b) {
    for (std::size_t i = 0; i < registers; ++i) a.part[i] += b.part[i];
    return a;
  }
  friend LanesCount operator-(LanesCount a, const LanesCount& b) {
    for (std::size_t i = 0; i < registers; ++i) a.part[i] -= b.part[i];
    return a;
  }
};

}  // namespace slipbench
