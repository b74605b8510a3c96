// Fixed-step explicit integration of x' = f(x, t) by Boost.Odeint, for every number type, without memory between steps.
//
//   euler (order 1), midpoint (2), rk4 (4), cash_karp5 (5, its fifth-order solution, error estimate unused)
//
// Only methods that start afresh at each step: one that reuses a slope or past steps drops to first order where inputs are
// held and jump. Time and factors are double, states Real; our own operations turn each factor into Real explicitly and
// write each sum in one order, so that lanes, floats and symbols compute what double does.
// Sources: W. Kutta, 1901 (rk4); J.R. Cash, A.H. Karp, ACM Trans. Math. Softw. 16(3), 1990, 201-222 (cash_karp5).
#pragma once

#include <array>
#include <boost/array.hpp>
#include <boost/fusion/container/vector.hpp>
#include <cstddef>
#include <optional>
#include <string_view>
#include <tuple>
#include <utility>

// Odeint's table of default algebras pulls in uBLAS, and with it <iostream>: compile time, and start-up code in units built
// for an instruction set that the processor may lack. We always name our algebra, so the table is declared, not included.
#define BOOST_NUMERIC_ODEINT_ALGEBRA_ALGEBRA_DISPATCHER_HPP_INCLUDED
namespace boost::numeric::odeint {
template <class State>
struct algebra_dispatcher;
}
#include <boost/numeric/odeint/algebra/array_algebra.hpp>
#include <boost/numeric/odeint/stepper/euler.hpp>
#include <boost/numeric/odeint/stepper/explicit_generic_rk.hpp>
#include <boost/numeric/odeint/stepper/runge_kutta4.hpp>
#include <boost/numeric/odeint/stepper/runge_kutta_cash_karp54_classic.hpp>

namespace slipbench {

enum class Stepper { euler, midpoint, rk4, cash_karp5 };

inline std::optional<Stepper> stepper_named(std::string_view name) {
  if (name == "euler") return Stepper::euler;
  if (name == "midpoint") return Stepper::midpoint;
  if (name == "rk4") return Stepper::rk4;
  if (name == "cash_karp5") return Stepper::cash_karp5;
  return {};
}
constexpr int order_of(Stepper method) {
  return method == Stepper::euler ? 1 : method == Stepper::midpoint ? 2 : method == Stepper::rk4 ? 4 : 5;
}

namespace detail {

// y = f_1 x_1 + f_2 x_2 + ...: left to right, no term left out. Every method's first factor is 1.
template <std::size_t Terms>
struct WeightedSum {
  std::array<double, Terms> factor;

  template <class Real, class... More>
  void operator()(Real& y, const Real& first, const More&... more) const {
    Real sum = Real(factor[0]) * first;
    std::size_t term = 1;
    ((sum = sum + Real(factor[term++]) * more), ...);
    y = sum;
  }
  typedef void result_type;
};

// What Odeint asks of its `Operations`: scale_sum1 .. scale_sumN, each constructed from its factors.
struct Operations {
#define SLIPBENCH_SCALE_SUM(terms)                                                                     \
  template <class... Factor>                                                                           \
  struct scale_sum##terms : WeightedSum<terms> {                                                       \
    template <class... Given>                                                                          \
    explicit scale_sum##terms(Given... given) : WeightedSum<terms>{{static_cast<double>(given)...}} {} \
  };
  SLIPBENCH_SCALE_SUM(1)
  SLIPBENCH_SCALE_SUM(2)
  SLIPBENCH_SCALE_SUM(3)
  SLIPBENCH_SCALE_SUM(4)
  SLIPBENCH_SCALE_SUM(5)
  SLIPBENCH_SCALE_SUM(6)
  SLIPBENCH_SCALE_SUM(7)
#undef SLIPBENCH_SCALE_SUM
};

namespace odeint = boost::numeric::odeint;

// Odeint's array_algebra with its loops over the states written out: at -O2 the compiler would keep them, and every
// intermediate in memory with them (1.7 times the time of a step).
struct Algebra : odeint::array_algebra {
  template <class Op, class Out, class... In>
  static void all(Op op, Out& out, const In&... in) {
    const auto one = [&](std::size_t i) __attribute__((always_inline)) { op(out[i], in[i]...); };
    [&]<std::size_t... I>(std::index_sequence<I...>) __attribute__((always_inline)) { (one(I), ...); }
    (std::make_index_sequence<std::tuple_size_v<Out>>{});
  }
  template <class O, class A, class Op>
  static void for_each2(O& o, A& a, Op op) {
    all(op, o, a);
  }
  template <class O, class A, class B, class Op>
  static void for_each3(O& o, A& a, B& b, Op op) {
    all(op, o, a, b);
  }
  template <class O, class A, class B, class C, class Op>
  static void for_each4(O& o, A& a, B& b, C& c, Op op) {
    all(op, o, a, b, c);
  }
  template <class O, class A, class B, class C, class D, class Op>
  static void for_each5(O& o, A& a, B& b, C& c, D& d, Op op) {
    all(op, o, a, b, c, d);
  }
  template <class O, class A, class B, class C, class D, class E, class Op>
  static void for_each6(O& o, A& a, B& b, C& c, D& d, E& e, Op op) {
    all(op, o, a, b, c, d, e);
  }
  template <class O, class A, class B, class C, class D, class E, class F, class Op>
  static void for_each7(O& o, A& a, B& b, C& c, D& d, E& e, F& f, Op op) {
    all(op, o, a, b, c, d, e, f);
  }
};

template <class Real, std::size_t N>
struct SteppersOf {
  using State = std::array<Real, N>;
  using Euler = odeint::euler<State, double, State, double, Algebra, Operations>;
  using Rk4 = odeint::runge_kutta4<State, double, State, double, Algebra, Operations>;
  using CashKarp5 = odeint::runge_kutta_cash_karp54_classic<State, double, State, double, Algebra, Operations>;
  // x + h f(x + h/2 f(x, t), t + h/2), as a table of coefficients.
  using TwoStages = odeint::explicit_generic_rk<2, 2, State, double, State, double, Algebra, Operations>;
  struct Midpoint : TwoStages {
    Midpoint()
        : TwoStages(boost::fusion::make_vector(boost::array<double, 1>{{0.5}}), boost::array<double, 2>{{0.0, 1.0}},
                    boost::array<double, 2>{{0.0, 0.5}}) {}
  };
};

template <Stepper M, class Real, std::size_t N>
auto make_stepper() {
  using Of = SteppersOf<Real, N>;
  if constexpr (M == Stepper::euler)
    return typename Of::Euler{};
  else if constexpr (M == Stepper::midpoint)
    return typename Of::Midpoint{};
  else if constexpr (M == Stepper::rk4)
    return typename Of::Rk4{};
  else
    return typename Of::CashKarp5{};
}

}  // namespace detail

// One step of x from t to t + h. `system(x, dxdt, t)` writes the derivative.
template <Stepper M, class Real, std::size_t N, class System>
inline void odeint_step(System&& system, std::array<Real, N>& x, double t, double h) {
  auto stepper = detail::make_stepper<M, Real, N>();
  auto&& derivative = [&](const std::array<Real, N>& at, std::array<Real, N>& dxdt, double time) {
    system(at, dxdt, time);
  };
  stepper.do_step(derivative, x, t, h);
}

// The same with the method chosen when the run is set up.
template <class Real, std::size_t N, class System>
inline void odeint_step(Stepper method, System&& system, std::array<Real, N>& x, double t, double h) {
  switch (method) {
    case Stepper::euler:
      return odeint_step<Stepper::euler>(system, x, t, h);
    case Stepper::midpoint:
      return odeint_step<Stepper::midpoint>(system, x, t, h);
    case Stepper::rk4:
      return odeint_step<Stepper::rk4>(system, x, t, h);
    case Stepper::cash_karp5:
      return odeint_step<Stepper::cash_karp5>(system, x, t, h);
  }
}

}  // namespace slipbench
