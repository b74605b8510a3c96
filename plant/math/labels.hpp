// Names and headings that a step gives its results, for the exported code: nothing at all for numbers that are computed; a
// number type that writes down what was computed (symbol.hpp) keeps them.
//
//   section<Real>("slip = R_R i_q / |psi|");        heads what is computed from here on
//   const Real slip = m.R_R * i_q * per_length;
//   SLIPBENCH_LABEL(slip, i_q)                      each result by its variable's name
//   label_alpha_beta("psi", psi);                   psi_alpha, psi_beta; label_d_q likewise
//
// The first name a result is given stays. Numbers and masks only; a struct is named by its parts.
#pragma once

#include "plant/math/fields.hpp"

namespace slipbench {

// Specialised by a number type (and its mask) that keeps notes.
template <class Number>
struct Notes {
  static constexpr bool kept = false;
};

template <class Real>
constexpr void section([[maybe_unused]] const char* equation) {
  if constexpr (Notes<Real>::kept) Notes<Real>::section(equation);
}

template <class Number>
constexpr void label([[maybe_unused]] const char* name, [[maybe_unused]] const Number& result) {
  if constexpr (Notes<Number>::kept) Notes<Number>::label(name, result);
}

// A space vector's parts, in the stationary frame or in a turning one.
template <template <class> class Vector, class Real>
constexpr void label_alpha_beta([[maybe_unused]] const char* name, [[maybe_unused]] const Vector<Real>& v) {
  if constexpr (Notes<Real>::kept) {
    Notes<Real>::label(std::string(name) + "_alpha", v.x);
    Notes<Real>::label(std::string(name) + "_beta", v.y);
  }
}
template <template <class> class Vector, class Real>
constexpr void label_d_q([[maybe_unused]] const char* name, [[maybe_unused]] const Vector<Real>& v) {
  if constexpr (Notes<Real>::kept) {
    Notes<Real>::label(std::string(name) + "_d", v.x);
    Notes<Real>::label(std::string(name) + "_q", v.y);
  }
}

// The first `count` of numbers in a row: name_0, name_1 and so on.
template <class Real>
constexpr void label_each([[maybe_unused]] const char* name, [[maybe_unused]] const Real* numbers,
                          [[maybe_unused]] std::size_t count) {
  if constexpr (Notes<Real>::kept) {
    for (std::size_t n = 0; n < count; ++n) Notes<Real>::label(std::string(name) + "_" + std::to_string(n), numbers[n]);
  }
}

// Those of the three phases.
template <template <class> class Three, class Real>
constexpr void label_phases([[maybe_unused]] const char* name, [[maybe_unused]] const Three<Real>& x) {
  if constexpr (Notes<Real>::kept) {
    Notes<Real>::label(std::string(name) + "_a", x.a);
    Notes<Real>::label(std::string(name) + "_b", x.b);
    Notes<Real>::label(std::string(name) + "_c", x.c);
  }
}

}  // namespace slipbench

#define SLIPBENCH_LABEL(...) SLIPBENCH_EXPAND(SLIPBENCH_LABEL_ONE(__VA_ARGS__))
#define SLIPBENCH_LABEL_ONE(result, ...) \
  ::slipbench::label(#result, result);   \
  __VA_OPT__(SLIPBENCH_LABEL_AGAIN SLIPBENCH_PARENS(__VA_ARGS__))
#define SLIPBENCH_LABEL_AGAIN() SLIPBENCH_LABEL_ONE
