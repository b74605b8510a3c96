// Truncated Taylor arithmetic against known series and closed forms; tolerances are rounding errors of sums of K terms of order 1.
#include <catch2/catch.hpp>

#include "plant/machine.hpp"
#include "plant/math/dual.hpp"
#include "plant/math/taylor.hpp"
#include "tests/published/circuits.hpp"

namespace slipbench {
namespace {

constexpr std::size_t K = 8;
using T = Taylor<double, K>;
using Series = std::array<double, K + 1>;

constexpr double few_roundings = 20.0 * 2.2e-16;

void check_series(const T& x, const Series& expected) {
  for (std::size_t k = 0; k <= K; ++k) {
    INFO("coefficient " << k);
    CHECK(x.at[k] == Approx(expected[k]).epsilon(few_roundings).margin(few_roundings));
  }
}

double factorial(std::size_t k) { return k < 2 ? 1.0 : static_cast<double>(k) * factorial(k - 1); }

}  // namespace

// The series are those of any table, e.g. M. Abramowitz, I.A. Stegun, "Handbook of Mathematical Functions", 1964, 3.6, 4.1-4.4.
TEST_CASE("taylor: known series", "[plant][taylor][published]") {
  const T t = T::time(0.0), one(1.0);
  check_series(one / (one - t), {1, 1, 1, 1, 1, 1, 1, 1, 1});
  check_series(exp(t), {1, 1, 1 / 2., 1 / 6., 1 / 24., 1 / 120., 1 / 720., 1 / 5040., 1 / 40320.});
  check_series(log(one + t), {0, 1, -1 / 2., 1 / 3., -1 / 4., 1 / 5., -1 / 6., 1 / 7., -1 / 8.});
  check_series(sqrt(one + t),
               {1, 1 / 2., -1 / 8., 1 / 16., -5 / 128., 7 / 256., -21 / 1024., 33 / 2048., -429 / 32768.});
  check_series(sincos(t).sin, {0, 1, 0, -1 / 6., 0, 1 / 120., 0, -1 / 5040., 0});
  check_series(sincos(t).cos, {1, 0, -1 / 2., 0, 1 / 24., 0, -1 / 720., 0, 1 / 40320.});
  check_series(atan2(t, one), {0, 1, 0, -1 / 3., 0, 1 / 5., 0, -1 / 7., 0});
  const double turn = 6.283185307179586;
  check_series(T(1.0 / turn) * (sincos_turns(t).sin / T(turn)),
               {0, 1 / turn, 0, -turn / 6., 0, turn * turn * turn / 120., 0, -std::pow(turn, 5) / 5040., 0});
}

TEST_CASE("taylor: identities hold about any point", "[plant][taylor]") {
  const T t = T::time(0.7), x = sqrt(t * t + T(1.0)) / (t + T(1.3));  // coefficients no larger than 1
  check_series(x * (T(1.0) / x), {1});
  check_series(exp(log(x)) - x, {});
  check_series(square(sincos(x).sin) + square(sincos(x).cos), {1});
  check_series(sqrt(square(x)) - x, {});
  const auto s = sincos(x);
  check_series(atan2(s.sin, s.cos) - wrap_angle(x), {});  // in range: the same angle
}

TEST_CASE("taylor: choices look at the leading coefficient, sides are kept", "[plant][taylor]") {
  const T t = T::time(0.0), up = T::time(1.0), down = T(-1.0) - t;
  CHECK(down < up);
  CHECK(t == T(0.0));
  check_series(select(down < up, up, down), {1, 1});
  check_series(fabs(down), {1, 1});
  check_series(fabs(t), {0, 1});
  check_series(floor(T::time(2.5)), {2});
  check_series(clamp(T::time(3.0), T(-1.0), T(1.0)), {1});
  check_series(sqrt(t), {});  // no series there: nothing invented, nothing infinite
}

TEST_CASE("taylor: over dual numbers, the series' derivative by where it starts", "[plant][taylor]") {
  using D = Dual<double, 1>;
  // exp(a t) from x' = a x, x(0) = a: x_k = a^{k+1} / k!, by a: (k + 1) a^k / k!.
  const double a = 1.3;
  const D start = D::variable(a, 0);
  const auto x = series_of_solution<K>(
      [&](const std::array<Taylor<D, K>, 1>& y) { return std::array{Taylor<D, K>(start) * y[0]}; }, std::array{start});
  for (std::size_t k = 0; k <= K; ++k) {
    const double n = static_cast<double>(k);
    CHECK(x[0].at[k].value == Approx(std::pow(a, n + 1.0) / factorial(k)).epsilon(few_roundings));
    CHECK(x[0].at[k].slope[0] == Approx((n + 1.0) * std::pow(a, n) / factorial(k)).epsilon(few_roundings));
  }
}

TEST_CASE("taylor: the machine's flux after a voltage step is the closed form's series", "[plant][taylor][published]") {
  // Voltage step at standstill, i(t) = (u / R_s) (1 + A_1 e^{p_1 t} + A_2 e^{p_2 t}), derived; values of the Krause 3 hp machine,
  // 10 V, computed from it to the digits shown: p and A to 1e-12 relative, so the k-th coefficient to k times that.
  const double p[] = {-4.0300703412, -313.1605932755}, A[] = {-0.6562486153220, -0.3437513846780}, u = 10.0;
  const auto circuit = published::krause_3hp_circuit().circuit;
  const auto m = in_number<Machine<T>, T>(make_machine(circuit));
  const auto psi = series_of_solution<K>(
      [&](const std::array<T, 4>& x) {
        const MachineFlux<T> flux{{x[0], x[1]}, {x[2], x[3]}};
        const auto rate = flux_derivative(m, flux, stator_current(m, flux), {T(u), T(0.0)}, T(0.0));
        return std::array{rate.stator.x, rate.stator.y, rate.rotor.x, rate.rotor.y};
      },
      std::array<double, 4>{});
  const T i = stator_current(m, MachineFlux<T>{{psi[0], psi[1]}, {psi[2], psi[3]}}).x;
  for (std::size_t k = 1; k <= K; ++k) {
    const double n = static_cast<double>(k);
    const double expected =
        u / circuit.stator_resistance * (A[0] * std::pow(p[0], n) + A[1] * std::pow(p[1], n)) / factorial(k);
    INFO("coefficient " << k);
    CHECK(i.at[k] == Approx(expected).epsilon(1e-10));
  }
}

}  // namespace slipbench
