// Averaged inverter: mean error of dead time and device drop.
#include <catch2/catch.hpp>
#include <cmath>
#include <complex>

#include "plant/inverter_averaged.hpp"

using namespace slipbench;

namespace {

constexpr double pi = 3.14159265358979323846;
const Phases<double> half{0.5, 0.5, 0.5};

Vec2<double> current_at(double amplitude, double angle) {
  return {amplitude * std::cos(angle), amplitude * std::sin(angle)};
}

// Harmonic h (signed: turning forward or back) of the error space vector under a circular current.
double error_harmonic(const LegError<double>& e, int h, double V_dc) {
  const int n = 12000;
  std::complex<double> sum;
  for (int i = 0; i < n; ++i) {
    const double angle = 2.0 * pi * (i + 0.5) / n;
    const Vec2<double> u = clarke(leg_errors(e, phases_of(current_at(10.0, angle)), half, V_dc));
    sum += std::complex<double>(u.x, u.y) * std::polar(1.0 / n, -h * angle);
  }
  return std::abs(sum);
}

}  // namespace

// S.-G. Jeong, M.-H. Park, IEEE Trans. Ind. Electron. 38(2), 1991; Y. Murai et al., IEEE Trans. Ind. Appl. 23(5), 1987:
// 540 V, 2 us, 10 kHz. Leg 10.8 V and vector (4/3) 10.8 V are exact; harmonics of the sampled square wave to
// (h pi / n)^2 / 6, 2e-6 at h = 11.
TEST_CASE("dead time: mean error of leg, vector and harmonics", "[plant][published]") {
  const LegError<double> e = leg_error(2e-6, 10e3, 0.0, 1e-6);
  const Phases<double> legs = leg_errors(e, {5.0, -2.0, -3.0}, half, 540.0);
  CHECK(legs.a == Approx(-10.8).epsilon(1e-14));
  CHECK(legs.b == Approx(10.8).epsilon(1e-14));
  CHECK(legs.c == Approx(10.8).epsilon(1e-14));
  CHECK(magnitude(clarke(legs)) == Approx(14.4).epsilon(1e-14));

  const double fundamental = error_harmonic(e, 1, 540.0);
  CHECK(fundamental == Approx(13.750987).epsilon(1e-7));
  CHECK(error_harmonic(e, -5, 540.0) == Approx(fundamental / 5.0).epsilon(5e-6));
  CHECK(error_harmonic(e, 7, 540.0) == Approx(fundamental / 7.0).epsilon(5e-6));
  CHECK(error_harmonic(e, -11, 540.0) == Approx(fundamental / 11.0).epsilon(5e-6));
  CHECK(error_harmonic(e, 3, 540.0) == Approx(0.0).margin(1e-10));  // the star point floats
  CHECK(error_harmonic(e, -1, 540.0) == Approx(0.0).margin(1e-10));
}

TEST_CASE("dead time: none in a tied leg, the drop stays", "[plant][physics]") {
  const LegError<double> e = leg_error(2e-6, 10e3, 1.2, 0.1);
  const Phases<double> legs = leg_errors(e, {5.0, -2.0, -3.0}, {1.0, 0.0, 0.4}, 540.0);
  CHECK(legs.a == Approx(-1.2).epsilon(1e-14));
  CHECK(legs.b == Approx(1.2).epsilon(1e-14));
  CHECK(legs.c == Approx(12.0).epsilon(1e-14));

  // Through discontinuous modulation: exactly one leg free of dead time, at every angle.
  for (int i = 0; i < 720; ++i) {
    const double angle = 0.002 + i * pi / 360.0;
    const Phases<double> d = modulate(Modulation::discontinuous, current_at(200.0, angle), 540.0);
    const Phases<double> error = leg_errors(e, {9.0, 9.0, 9.0}, d, 540.0);
    int without = 0;
    for (const double x : {error.a, error.b, error.c}) without += std::fabs(x + 1.2) < 1e-12 ? 1 : 0;
    REQUIRE(without == 1);
  }
}

TEST_CASE("leg error: straight through the current's zero, odd, and never feeding power in", "[plant][physics]") {
  const LegError<double> e = leg_error(3e-6, 8e3, 0.9, 0.2);
  const double full = 3e-6 * 8e3 * 600.0 + 0.9;
  CHECK(leg_errors(e, {0.1, -0.05, 0.0}, half, 600.0).a == Approx(-0.5 * full).epsilon(1e-14));
  CHECK(leg_errors(e, {0.1, -0.05, 0.0}, half, 600.0).b == Approx(0.25 * full).epsilon(1e-14));
  CHECK(leg_errors(e, {0.1, -0.05, 0.0}, half, 600.0).c == 0.0);
  for (int i = 0; i < 360; ++i) {
    const Vec2<double> current = current_at(0.03 * i, 0.1 * i);
    const Vec2<double> u = clarke(leg_errors(e, phases_of(current), half, 600.0));
    const Vec2<double> back = clarke(leg_errors(e, phases_of(-current), half, 600.0));
    CHECK(magnitude(u + back) < 1e-12);
    CHECK(dot(u, current) <= 0.0);
  }
}

TEST_CASE("averaged inverter: voltage is the duties' less the errors", "[plant][physics]") {
  const LegError<double> e = leg_error(2e-6, 10e3, 0.0, 0.01);
  const Vec2<double> wanted{150.0, 60.0};
  const Phases<double> d = modulate(Modulation::space_vector, wanted, 540.0);
  const Vec2<double> got = averaged_voltage(e, phases_of(current_at(8.0, 0.0)), d, 540.0);
  // i_a > 0, i_b, i_c < 0: the vector error lies on the alpha axis.
  CHECK(got.x == Approx(150.0 - 14.4).epsilon(1e-13));
  CHECK(got.y == Approx(60.0).epsilon(1e-13));
}

TEST_CASE("inverter: the error vector equals Clarke's transform of the leg errors", "[plant][inverter]") {
  const LegError<double> e = leg_error(2e-6, 10e3, 1.0, 0.3);
  for (const Phases<double>& duty :
       {Phases<double>{0.2, 0.6, 0.9}, Phases<double>{0.0, 0.4, 1.0}, Phases<double>{1.0, 0.5, 0.3}}) {
    const LegPull<double> pull = leg_pull(leg_error_size(e, duty, 540.0));
    for (int degrees = 0; degrees < 360; degrees += 7) {
      for (const double amplitude : {0.0, 0.1, 0.35, 8.0}) {
        const double angle = degrees * 3.14159265358979323846 / 180.0;
        const Vec2<double> i{amplitude * std::cos(angle), amplitude * std::sin(angle)};
        const Vec2<double> whole = clarke(leg_errors(e, phases_of(i), duty, 540.0)),
                           fast = leg_error_vector(e, pull, i);
        // Rounding of some twenty operations on voltages up to 15 V.
        CHECK(std::fabs(whole.x - fast.x) < 20 * 15 * 2.3e-16);
        CHECK(std::fabs(whole.y - fast.y) < 20 * 15 * 2.3e-16);
      }
    }
  }
}
