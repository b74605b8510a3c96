// Modulation: dwell times, linear limits, overmodulation clamp, common mode of the three kinds.
#include "plant/modulation.hpp"

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <complex>

using namespace slipbench;

namespace {

constexpr double pi = 3.14159265358979323846;
constexpr Modulation kinds[] = {Modulation::space_vector, Modulation::sine, Modulation::discontinuous};

Vec2<double> vector_at(double amplitude, double angle) {
  return {amplitude * std::cos(angle), amplitude * std::sin(angle)};
}

// Amplitude of harmonic h over one turn of x(angle), n samples at the middles of equal steps.
template <class F>
double harmonic(int h, int n, F x) {
  std::complex<double> sum;
  for (int i = 0; i < n; ++i) {
    const double angle = 2.0 * pi * (i + 0.5) / n;
    sum += x(angle) * std::polar(2.0 / n, -h * angle);
  }
  return std::abs(sum);
}

}  // namespace

// H.W. van der Broeck, H.-C. Skudelny, G. Stanke, IEEE Trans. Ind. Appl. 24(1), 1988: V = 0.5 V_dc, 20 degrees, T_s
// = 100 us. Twelve printed decimals of microseconds: 1e-11.
TEST_CASE("space vector modulation: dwell times", "[plant][published]") {
  const double V_dc = 540.0, T_s = 100.0;
  const Phases<double> d = modulate(Modulation::space_vector, vector_at(0.5 * V_dc, 20.0 * pi / 180.0), V_dc);
  CHECK(T_s * (d.a - d.b) == Approx(55.667039922642).epsilon(1e-11));
  CHECK(T_s * (d.b - d.c) == Approx(29.619813272602).epsilon(1e-11));
  CHECK(T_s * (1.0 - d.a) == Approx(0.5 * 14.713146804755).epsilon(1e-11));
  CHECK(T_s * d.c == Approx(0.5 * 14.713146804755).epsilon(1e-11));
}

// Linear up to 1/2 (sine) and 1/sqrt 3 of the link (others; same source): the mean applied is the command to
// rounding (a few ulp of 540 V, 1e-12 of it), and 0.1 % more is not reached at every angle.
TEST_CASE("modulation: linear limits", "[plant][published]") {
  CHECK(linear_limit(Modulation::sine) == 0.5);
  CHECK(linear_limit(Modulation::space_vector) == Approx(0.5773502691896).epsilon(1e-12));
  CHECK(linear_limit(Modulation::discontinuous) == linear_limit(Modulation::space_vector));
  const double V_dc = 540.0;
  for (const Modulation kind : kinds) {
    double inside = 0.0, beyond = 0.0;
    for (int i = 0; i < 720; ++i) {
      const double angle = i * pi / 360.0;
      const auto miss = [&](double amplitude) {
        const Vec2<double> u = vector_at(amplitude * V_dc, angle);
        return magnitude(applied_voltage(modulate(kind, u, V_dc), V_dc) - u);
      };
      inside = std::max(inside, miss(linear_limit(kind)));
      beyond = std::max(beyond, miss(1.001 * linear_limit(kind)));
    }
    INFO("kind " << static_cast<int>(kind));
    CHECK(inside < 1e-12 * V_dc);
    CHECK(beyond > 1e-4 * V_dc);
  }
}

// The clamp ends in six-step: fundamental 2/pi of the link (same source), from below. Sampled at n points the
// square wave's fundamental is exact to (6 pi / n)^2 / 6 = 5e-8.
TEST_CASE("modulation: the clamped fundamental nears six-step from below", "[plant][published]") {
  const int n = 36000;
  for (const Modulation kind : kinds) {
    double before = 0.0;
    for (const double amplitude : {0.5, 0.6, 0.8, 2.0, 20.0, 2000.0}) {
      const double h1 = harmonic(
          1, n, [&](double angle) { return applied_voltage(modulate(kind, vector_at(amplitude, angle), 1.0), 1.0).x; });
      INFO("kind " << static_cast<int>(kind) << ", command " << amplitude << ", fundamental " << h1);
      CHECK(h1 <= 0.6366197723676 * (1.0 + 1e-7));
      CHECK(h1 >= before - 1e-7);
      before = h1;
    }
    CHECK(before == Approx(0.6366197723676).epsilon(1e-6));
  }
}

// D.G. Holmes, T.A. Lipo, "Pulse Width Modulation for Power Converters", 2003: third harmonic of the min-max reference,
// 3 sqrt 3 / (8 pi) of the phase amplitude. Midpoint sums over kinked sines: (3 pi / n)^2, 1e-6.
TEST_CASE("space vector modulation: third harmonic of the reference", "[plant][published]") {
  const double M = 0.8;
  const auto common = [&](Modulation kind) {
    return harmonic(3, 12000, [&](double angle) {
      const Phases<double> d = modulate(kind, vector_at(0.5 * M, angle), 1.0);
      return (d.a + d.b + d.c) / 3.0 - 0.5;
    });
  };
  CHECK(common(Modulation::space_vector) == Approx(0.206748335783 * 0.5 * M).epsilon(1e-6));
  CHECK(common(Modulation::sine) == Approx(0.0).margin(1e-14));
}

// Whatever the common mode, line to line it is the same three-phase set; rounding only.
TEST_CASE("modulation: line voltages do not depend on the common mode", "[plant][physics]") {
  const double V_dc = 600.0;
  for (int i = 0; i < 360; ++i) {
    const Vec2<double> u = vector_at(0.49 * V_dc, i * pi / 180.0);
    const Phases<double> leg = phases_of(u);
    for (const Modulation kind : kinds) {
      const Phases<double> d = modulate(kind, u, V_dc);
      CHECK(V_dc * (d.a - d.b) == Approx(leg.a - leg.b).margin(1e-12 * V_dc));
      CHECK(V_dc * (d.b - d.c) == Approx(leg.b - leg.c).margin(1e-12 * V_dc));
    }
  }
}

// To the last bit: a leg that is a rounding error away from its rail would be given a dead time.
TEST_CASE("discontinuous modulation: one leg is tied at any angle", "[plant][physics]") {
  for (const double V_dc : {540.0, 513.7}) {
    for (const double amplitude : {0.01, 0.3, 0.57, 0.7}) {
      for (int i = 0; i < 3600; ++i) {
        const double angle = i * pi / 1800.0;
        const Phases<double> d = modulate(Modulation::discontinuous, vector_at(amplitude * V_dc, angle), V_dc);
        const auto tied = [](double x) { return x == 0.0 || x == 1.0; };
        REQUIRE((tied(d.a) || tied(d.b) || tied(d.c)));
        // Leg a is on its upper rail 30 degrees either side of its peak, and nowhere else for smaller commands.
        const double off = std::fabs(std::remainder(angle, 2.0 * pi)) * 180.0 / pi;
        if (off < 29.9) REQUIRE(d.a == 1.0);
        if (off > 30.1 && amplitude < 0.5) REQUIRE(d.a < 1.0);
      }
    }
  }
}

// Small turns move the duties of space-vector and sine modulation, and the mean voltage of all three, by small
// amounts: at most the amplitude times the turn; twice that with the common mode.
TEST_CASE("modulation: continuous in the angle", "[plant][physics]") {
  const double turn = 1e-4, amplitude = 0.65;
  for (const Modulation kind : kinds) {
    for (double angle = 0.0; angle < 2.0 * pi; angle += 0.003) {
      const Phases<double> a = modulate(kind, vector_at(amplitude, angle), 1.0);
      const Phases<double> b = modulate(kind, vector_at(amplitude, angle + turn), 1.0);
      const double moved = std::max({std::fabs(a.a - b.a), std::fabs(a.b - b.b), std::fabs(a.c - b.c)});
      if (kind != Modulation::discontinuous) REQUIRE(moved < 2.0 * amplitude * turn);
      REQUIRE(magnitude(applied_voltage(a, 1.0) - applied_voltage(b, 1.0)) < 2.0 * amplitude * turn);
    }
  }
}

TEST_CASE("modulation: the choice by number gives the same bits", "[plant][number_types]") {
  for (int i = 0; i < 200; ++i) {
    const Vec2<double> u = vector_at(5.0 * i, 0.37 * i);
    for (const Modulation kind : kinds) {
      const Phases<double> a = modulate(kind, u, 540.0);
      const Phases<double> b = modulate(static_cast<double>(kind), u, 540.0);
      CHECK((a.a == b.a && a.b == b.b && a.c == b.c));
    }
  }
}

TEST_CASE("modulation: a dead DC link gives finite duties", "[plant][input]") {
  for (const Modulation kind : kinds) {
    for (const double V_dc : {0.0, -1.0}) {
      const Phases<double> d = modulate(kind, Vec2<double>{100.0, -30.0}, V_dc);
      for (const double x : {d.a, d.b, d.c}) CHECK((x >= 0.0 && x <= 1.0));
    }
  }
}
