// Dual's derivatives against central differences, within the differences' own error:
//   |f'(x) - (f(x+h) - f(x-h)) / 2h| <= h^2/6 max|f'''| + error of f / h.
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "plant/math/dual.hpp"
#include "plant/math/lanes.hpp"
#include "tests/plant/bits.hpp"
#include "tests/plant/machines.hpp"

namespace slipbench {
namespace {

constexpr double eps = std::numeric_limits<double>::epsilon();

// A number type that adds up the size of every term, whatever its sign: rounding errors of the same source in double are
// at most (operations on the longest path) * eps/2 * that.
struct Size {
  using Mask = bool;
  using Count = std::int64_t;
  using Scalar = double;
  double x = 0.0;
  Size() = default;
  explicit Size(double v) : x(std::fabs(v)) {}
  friend Size operator+(Size a, Size b) { return Size(a.x + b.x); }
  friend Size operator-(Size a, Size b) { return Size(a.x + b.x); }
  friend Size operator*(Size a, Size b) { return Size(a.x * b.x); }
  friend Size operator-(Size a) { return a; }
};

template <class Real>
MachineState<Real> rates(const MachineOnVoltage<double>& machine, const MachineState<Real>& x) {
  MachineState<Real> dxdt{};
  in_number<MachineOnVoltage<Real>, Real>(machine)(x, dxdt, 0.0);
  return dxdt;
}

// f at x in Dual and by central differences; f''' bounds its third derivative on [x - h, x + h].
template <class F>
void check_derivative(F f, double x, double third) {
  const double h = std::ldexp(std::fabs(x) + 1.0, -17);
  const auto dual = f(Dual<double, 1>::variable(x, 0));
  const double high = f(x + h), low = f(x - h), step = (x + h) - (x - h);
  // f is good to 2 ulp at either end; twice eps of its size covers that.
  const double bound = h * h / 6.0 * third + 2.0 * eps * (std::fabs(high) + std::fabs(low)) / (2.0 * h) +
                       4.0 * eps * std::fabs(dual.slope[0]);
  INFO("at " << x);
  CHECK(dual.value == f(x));
  CHECK(std::fabs(dual.slope[0] - (high - low) / step) <= bound);
}

}  // namespace

TEST_CASE("dual: Jacobian of the machine equals central differences", "[plant][dual]") {
  using D = Dual<double, 5>;
  const auto machine = test_machine();
  MachineState<D> x;
  for (std::size_t j = 0; j < 5; ++j) x[j] = D::variable(test_state[j], j);
  const auto jacobian = rates(machine, x);

  MachineState<Size> size_at;
  for (std::size_t j = 0; j < 5; ++j) size_at[j] = Size(2.0 * test_state[j] + 1.0);  // covers x +- h
  const auto size = rates(machine, size_at);
  const auto here = rates(machine, test_state);
  for (std::size_t j = 0; j < 5; ++j) {
    const double h = std::ldexp(1.0, -10);
    auto high = test_state, low = test_state;
    high[j] += h, low[j] -= h;
    const auto above = rates(machine, high), below = rates(machine, low);
    for (std::size_t i = 0; i < 5; ++i) {
      INFO("d rate " << i << " / d x " << j);
      CHECK(same_bits(jacobian[i].value, here[i]));
      // The equations are quadratic: no truncation error. Longest path: 8 operations, eps/2 each, either end, over 2 h.
      const double bound = 8.0 * 0.5 * eps * size[i].x * 2.0 / (2.0 * h);
      CHECK(std::fabs(jacobian[i].slope[j] - (above[i] - below[i]) / (high[j] - low[j])) <= bound);
    }
  }
  CHECK(std::fabs(jacobian[0].slope[0]) > 1.0);  // -R_s L_r / D: there is something to compare
}

TEST_CASE("dual: derivatives of the elementary functions equal central differences", "[plant][dual]") {
  for (double x : {-3.0, -0.4, 0.1, 1.3, 2.9}) {
    const double tau = 6.28318530717958647693;
    check_derivative([](auto v) { return slipbench::sincos(v).sin; }, x, 1.0);
    check_derivative([](auto v) { return slipbench::sincos(v).cos; }, x, 1.0);
    check_derivative([](auto v) { return slipbench::sincos_turns(v).sin; }, x, tau * tau * tau);
    check_derivative([](auto v) { return slipbench::sincos_turns(v).cos; }, x, tau * tau * tau);
    check_derivative([](auto v) { return slipbench::exp(v); }, x, std::exp(x + 0.1));
    check_derivative([](auto v) { return slipbench::wrap_angle(v); }, x, 0.0);
    // atan's third derivative, (6 x^2 - 2) / (1 + x^2)^3, is at most 2.
    check_derivative([](auto v) { return slipbench::atan2(v, decltype(v)(1.0)); }, x, 2.0);
    check_derivative([](auto v) { return slipbench::atan2(decltype(v)(1.0), v); }, x, 2.0);
    const double positive = std::fabs(x);
    check_derivative([](auto v) { return slipbench::log(v); }, positive, 2.1 / (positive * positive * positive));
    check_derivative([](auto v) { return sqrt(v); }, positive, 0.4 * std::pow(positive, -2.5));
    check_derivative([](auto v) { return decltype(v)(1.0) / v; }, x, 6.1 / (positive * positive * positive * positive));
    check_derivative([](auto v) { return fabs(v) * v; }, x, 0.0);
  }
}

TEST_CASE("dual: select takes value and slope together, and a guarded root stays finite", "[plant][dual]") {
  using D = Dual<double, 1>;
  const D x = D::variable(0.0, 0);
  const D y = select(x < D(1.0), D(3.0) * x, x * x);
  CHECK((y.value == 0.0 && y.slope[0] == 3.0));
  CHECK((sqrt(x).slope[0] == 0.0 && slipbench::atan2(x, x).slope[0] == 0.0));
  CHECK((floor(D::variable(2.7, 0)).value == 2.0 && floor(D::variable(2.7, 0)).slope[0] == 0.0));
}

TEST_CASE("dual: over lanes and over itself it is the same derivative", "[plant][dual]") {
  using Pack = Lanes<Sse2, 2>;
  using D = Dual<double, 1>;
  const auto f = [](const auto& v) { return slipbench::exp(slipbench::sincos(v).sin) * v; };
  Pack two(0.3);
  two.set(1, -1.7);
  const auto packed = f(Dual<Pack, 1>::variable(two, 0));
  for (std::size_t lane = 0; lane < 2; ++lane) {
    const D alone = f(D::variable(two.get(lane), 0));
    CHECK(same_bits(packed.value.get(lane), alone.value));
    CHECK(same_bits(packed.slope[0].get(lane), alone.slope[0]));
  }
  // Second derivative of x^3 by nesting: 6 x, every product exact here.
  using DD = Dual<D, 1>;
  const DD x = DD::variable(D::variable(1.5, 0), 0);
  CHECK((x * x * x).slope[0].slope[0] == 9.0);
}

}  // namespace slipbench
