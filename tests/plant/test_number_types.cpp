// One source, every number type: the machine's right-hand side in all of them, mixed arithmetic refused, and a long run
// whose bits are committed, so that every build and optimisation level must give them again.
#include <catch2/catch.hpp>
#include <concepts>
#include <cstdio>

#include "plant/math/dual.hpp"
#include "plant/math/lanes.hpp"
#include "plant/math/symbol.hpp"
#include "sim/engine/steppers.hpp"
#include "tests/plant/bits.hpp"
#include "tests/plant/machines.hpp"

namespace slipbench {
namespace {

// Mixed arithmetic must not compile, whichever side the plain number stands on; nor may a plain number slip in silently.
template <class A, class B>
concept Mixes = requires(A a, B b) {
  a + b;
}
|| requires(A a, B b) { b + a; }
|| requires(A a, B b) { a* b; }
|| requires(A a, B b) { b* a; }
|| requires(A a, B b) { a - b; }
|| requires(A a, B b) { a / b; }
|| requires(A a, B b) { a < b; }
|| requires(A a, B b) { a == b; }
|| requires(A a, B b) { select(a < a, a, b); };
template <class Real>
constexpr bool closed =
    !Mixes<Real, double> && !Mixes<Real, float> && !Mixes<Real, int> && !std::convertible_to<double, Real> &&
    !std::convertible_to<Real, double> && !std::convertible_to<int, Real>;
static_assert(closed<Lanes<Sse2, 2>> && closed<Lanes<Avx2, 8>> && closed<Lanes<Avx512, 16>>);
static_assert(closed<Dual<double, 3>> && closed<Dual<float, 3>> && closed<Dual<Lanes<Sse2, 2>, 3>>);
static_assert(closed<Symbol<float>> && closed<Symbol<double>>);
static_assert(!Mixes<Lanes<Sse2, 2>, Lanes<Avx2, 4>> && !Mixes<Symbol<float>, Symbol<double>>);
static_assert(!Mixes<Dual<double, 2>, Dual<double, 3>> && !Mixes<Lanes<Sse2, 2>, Dual<Lanes<Sse2, 2>, 1>>);
static_assert(Mixes<double, double>);  // the question can be answered with yes

template <class Real>
MachineState<Real> rates() {
  const auto machine = in_number<MachineOnVoltage<Real>, Real>(test_machine());
  MachineState<Real> x, dxdt;
  for (std::size_t i = 0; i < 5; ++i) x[i] = Real(test_state[i]);
  machine(x, dxdt, 0.0);
  return dxdt;
}

// 20,000 RK4 steps on mains (voltage from sincos_turns, held over a step), every state hashed.
template <class Real>
std::uint64_t hash_of_run() {
  auto machine = in_number<MachineOnVoltage<Real>, Real>(test_machine());
  MachineState<Real> x{};
  Fnv hash;
  for (std::int64_t n = 0; n < 20000; ++n) {
    const double t = static_cast<double>(n) * 1e-5;
    const auto angle = slipbench::sincos_turns(Real(50.0) * Real(t));
    machine.voltage = Real(325.0) * Vec2<Real>{angle.cos, angle.sin};
    odeint_step<Stepper::rk4>(machine, x, t, 1e-5);
    for (const Real& value : x) hash.add(value);
  }
  CHECK(is_finite(x[4]));
  CHECK(x[4] > Real(50.0));  // it ran up
  return hash.value();
}

}  // namespace

TEST_CASE("number types: one right-hand side, the same value in all", "[plant][numbers][bits]") {
  const auto in_double = rates<double>();
  const auto in_float = rates<float>();
  const auto sse2 = rates<Lanes<Sse2, 4>>();
  const auto avx2 = rates<Lanes<Avx2, 4>>();  // here without its instructions: same source, same bits
  const auto dual = rates<Dual<double, 2>>();
  const auto dual_float = rates<Dual<float, 2>>();
  const auto dual_lanes = rates<Dual<Lanes<Sse2, 2>, 2>>();
  const auto symbol = rates<Symbol<double>>();
  const auto symbol_float = rates<Symbol<float>>();
  for (std::size_t i = 0; i < 5; ++i) {
    CHECK(same_bits(sse2[i].get(3), in_double[i]));
    CHECK(same_bits(avx2[i].get(1), in_double[i]));
    CHECK(same_bits(dual[i].value, in_double[i]));
    CHECK(same_bits(dual_lanes[i].value.get(0), in_double[i]));
    REQUIRE(symbol[i].is_constant());
    CHECK(same_bits(symbol[i].value(), in_double[i]));
    CHECK(same_bits(dual_float[i].value, in_float[i]));
    CHECK(same_bits(symbol_float[i].value(), in_float[i]));
    // Single precision: about 10 operations of 6e-8 each on terms up to a hundred times the result.
    CHECK(static_cast<double>(in_float[i]) == Approx(in_double[i]).epsilon(1e-4));
  }
}

TEST_CASE("number types: a run of 20,000 steps gives the committed bits", "[plant][numbers][bits]") {
  const auto in_double = hash_of_run<double>(), in_float = hash_of_run<float>();
  char text[80];
  std::snprintf(text, sizeof text, "double %016llx float %016llx", static_cast<unsigned long long>(in_double),
                static_cast<unsigned long long>(in_float));
  INFO(text);
  // Committed from a release build; a change here is a change of every simulation's bits, to be explained in the change log.
  CHECK(in_double == 0x8f4a5ec2872ea81fu);
  CHECK(in_float == 0x0d32437b98397ca4u);
}

}  // namespace slipbench
