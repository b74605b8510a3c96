// The steppers: order by halving against a closed form, same step for every number type, no allocation.
#include <array>
#include <atomic>
#include <catch2/catch.hpp>
#include <cmath>
#include <cstdlib>
#include <new>

#include "plant/math/dual.hpp"
#include "plant/math/lanes.hpp"
#include "sim/engine/steppers.hpp"
#include "tests/plant/bits.hpp"
#include "tests/plant/machines.hpp"

namespace {
std::atomic<long> allocations{0};
void* counted(std::size_t size) {
  ++allocations;
  if (void* memory = std::malloc(size ? size : 1)) return memory;
  throw std::bad_alloc();
}
}  // namespace
void* operator new(std::size_t size) { return counted(size); }
void* operator new[](std::size_t size) { return counted(size); }
// These two as well: a sanitizer brings its own otherwise, which do not call the ones above.
void* operator new(std::size_t size, const std::nothrow_t&) noexcept {
  return ++allocations, std::malloc(size ? size : 1);
}
void* operator new[](std::size_t size, const std::nothrow_t&) noexcept {
  return ++allocations, std::malloc(size ? size : 1);
}
void operator delete(void* memory) noexcept { std::free(memory); }
void operator delete[](void* memory) noexcept { std::free(memory); }
void operator delete(void* memory, std::size_t) noexcept { std::free(memory); }
void operator delete[](void* memory, std::size_t) noexcept { std::free(memory); }

namespace slipbench {
namespace {

constexpr Stepper every_stepper[] = {Stepper::euler, Stepper::midpoint, Stepper::rk4, Stepper::cash_karp5};

// x' = x cos t, y' = z, z' = -y: the time enters, and the states couple. Solution e^{sin t}, sin t, cos t.
double error_after(Stepper stepper, int steps) {
  std::array<double, 3> x{1.0, 0.0, 1.0};
  const double h = 2.0 / steps;
  const auto system = [](const std::array<double, 3>& s, std::array<double, 3>& rate, double t) {
    rate = {s[0] * std::cos(t), s[2], -s[1]};
  };
  for (int n = 0; n < steps; ++n) odeint_step(stepper, system, x, n * h, h);
  return std::fabs(x[0] - std::exp(std::sin(2.0))) + std::fabs(x[1] - std::sin(2.0)) + std::fabs(x[2] - std::cos(2.0));
}

}  // namespace

TEST_CASE("steppers: halving the step shows each method's order", "[plant][steppers]") {
  for (Stepper stepper : every_stepper) {
    const int coarse = order_of(stepper) >= 4 ? 100 : 2000;
    const double order = std::log2(error_after(stepper, coarse) / error_after(stepper, 2 * coarse));
    // The next term of the error is O(h) of the first: h is at most 0.02 here, its factor of order one to five.
    CHECK(order == Approx(order_of(stepper)).margin(0.1));
  }
}

TEST_CASE("steppers: names are those of a scenario", "[plant][steppers]") {
  CHECK(stepper_named("euler") == Stepper::euler);
  CHECK(stepper_named("midpoint") == Stepper::midpoint);
  CHECK(stepper_named("rk4") == Stepper::rk4);
  CHECK(stepper_named("cash_karp5") == Stepper::cash_karp5);
  CHECK_FALSE(stepper_named("rk5").has_value());
}

TEST_CASE("steppers: rk4 is the hand-written loop, to the bit", "[plant][steppers][bits]") {
  const auto machine = test_machine();
  MachineState<double> x = test_state, y = test_state;
  const double h = 1e-5, sixth = 1.0 / 6.0, third = 1.0 / 3.0;
  bool same = true;
  for (int n = 0; n < 2000; ++n) {
    odeint_step<Stepper::rk4>(machine, x, n * h, h);
    MachineState<double> k1, k2, k3, k4, at;
    machine(y, k1, 0.0);
    for (std::size_t i = 0; i < 5; ++i) at[i] = y[i] + (0.5 * h) * k1[i];
    machine(at, k2, 0.0);
    for (std::size_t i = 0; i < 5; ++i) at[i] = y[i] + (0.5 * h) * k2[i];
    machine(at, k3, 0.0);
    for (std::size_t i = 0; i < 5; ++i) at[i] = y[i] + h * k3[i];
    machine(at, k4, 0.0);
    for (std::size_t i = 0; i < 5; ++i) {
      y[i] = y[i] + (sixth * h) * k1[i] + (third * h) * k2[i] + (third * h) * k3[i] + (sixth * h) * k4[i];
    }
    for (std::size_t i = 0; i < 5; ++i) same = same && same_bits(x[i], y[i]);
  }
  CHECK(same);
}

TEST_CASE("steppers: no step allocates", "[plant][steppers]") {
  auto machine = test_machine();
  MachineState<double> x = test_state;
  using Pack = Lanes<Sse2, 4>;
  using D = Dual<double, 5>;
  const auto packs = in_number<MachineOnVoltage<Pack>, Pack>(machine);
  const auto duals = in_number<MachineOnVoltage<D>, D>(machine);
  MachineState<Pack> p{};
  MachineState<D> d{};
  const long before = allocations;
  for (Stepper stepper : every_stepper) {
    odeint_step(stepper, machine, x, 0.0, 1e-5);
    odeint_step(stepper, packs, p, 0.0, 1e-5);
    odeint_step(stepper, duals, d, 0.0, 1e-5);
  }
  CHECK(allocations == before);
  delete new int(1);  // the counter counts
  CHECK(allocations == before + 1);
}

}  // namespace slipbench
