// Figures of the drive on synthetic signals with closed forms, and copper loss against the equivalent circuit.
#include <catch2/catch.hpp>
#include <cmath>
#include <complex>
#include <limits>

#include "sim/score/drive_score.hpp"
#include "tests/sim/score/stream.hpp"

using namespace slipbench;
using namespace slipbench::test;

namespace {

constexpr double pi = 3.14159265358979323846, no_number = std::numeric_limits<double>::quiet_NaN();
constexpr double rounding = 1e-12;  // about 1000 additions of terms of the size of the result

ScoreBasis basis() {
  ScoreBasis b;
  b.window = {0.0, 1.0};
  b.control_period_s = 1e-3;
  b.rated_speed_rpm = 1500.0;
  b.circuit = {2, 0.435, 0.816, 0.002, 0.002, 0.0693};
  b.has_controller = true;
  return b;
}

}  // namespace

TEST_CASE("drive score: ripple, peak and clipping of a known torque and current", "[score][closed_form]") {
  ScoreBasis b = basis();
  b.window.to_s = 0.999;
  DriveScore score(b);
  Stream{}.feed(score, [](double t, PlantRow& plant, std::vector<Estimate<double>>&, bool& clipped) {
    plant[P::torque] = 1e4 + 2.0 * std::sin(2.0 * pi * 10.0 * t);  // the mean must not eat the ripple's digits
    plant[P::i_alpha] = 3.0 * std::cos(314.0 * t), plant[P::i_beta] = 3.0 * std::sin(314.0 * t);
    clipped = t < 0.2495;
  });
  const DriveFigures f = score.figures();
  CHECK(*f.torque_ripple_Nm == Approx(std::sqrt(2.0)).epsilon(1e-9));  // 1e4 carries roundings of 1e-12, 1e4 times that
  CHECK(*f.peak_current_A == Approx(3.0).epsilon(rounding));
  CHECK(*f.voltage_clipped_fraction == Approx(0.25).epsilon(rounding));
  CHECK(*f.speed_tracking_rmse_rpm == 0.0);
  CHECK_FALSE(f.load_dip_rpm);  // no load step
}

TEST_CASE("drive score: a speed dip of known depth and decay", "[score][closed_form]") {
  // After the step at 0.3 s the speed is 1000 - 80 x e exp(1 - x), x = (t - 0.3) / 0.02 s: 80 / e ... deepest at x = 1 with
  // 80 rpm; within 30 rpm (2 % of 1500) from x e^(1 - x) = 3/8 on, x = 3.20606 (root found by bisection below).
  const auto dip = [](double x) { return 80.0 * x * std::exp(1.0 - x); };
  double low = 1.0, high = 10.0;
  for (int i = 0; i < 60; ++i) (dip(0.5 * (low + high)) > 30.0 ? low : high) = 0.5 * (low + high);
  ScoreBasis b = basis();
  b.load_steps_s = {0.3};
  DriveScore score(b);
  Stream{}.feed(score, [&](double t, PlantRow& plant, std::vector<Estimate<double>>&, bool&) {
    plant[P::speed_reference_rpm] = t < 0.7995 ? 1000.0 : 500.0;  // the new reference ends the watch
    plant[P::speed_rpm] = 1000.0 - (t > 0.3 ? dip((t - 0.3) / 0.02) : 0.0);
  });
  const DriveFigures f = score.figures();
  CHECK(*f.load_dip_rpm == Approx(80.0).epsilon(rounding));  // the deepest point, 0.32 s, is a tick
  const double next_tick = std::ceil((0.3 + 0.02 * low) / 1e-3) * 1e-3;
  CHECK(*f.recovery_s == Approx(next_tick - 0.3).epsilon(1e-9));  // times of ticks, in rounding
}

TEST_CASE("drive score: the worst of several load steps; one that is not recovered leaves no recovery",
          "[score][closed_form]") {
  ScoreBasis b = basis();
  b.load_steps_s = {0.2, 0.6};
  b.window.from_s = 0.1;
  const auto run = [&](double second_ms) {
    DriveScore score(b);
    Stream{}.feed(score, [&](double t, PlantRow& plant, std::vector<Estimate<double>>&, bool&) {
      const double k = std::round(t * 1e3);
      plant[P::speed_reference_rpm] = 1000.0;
      plant[P::speed_rpm] =
          1000.0 - (k >= 200 && k < 250 ? 40.0 : 0.0) + (k >= 600 && k < 600 + second_ms ? 70.0 : 0.0);
    });
    return score.figures();
  };
  CHECK(*run(100).load_dip_rpm == 70.0);
  CHECK(*run(100).recovery_s == Approx(0.1).epsilon(1e-9));
  CHECK(*run(20).recovery_s == Approx(0.05).epsilon(1e-9));
  CHECK_FALSE(run(1000).recovery_s);
}

TEST_CASE("drive score: without a reference there is no tracking, and the dip counts from the speed at the step",
          "[score][edge]") {
  ScoreBasis b = basis();
  b.load_steps_s = {0.5};
  b.has_controller = false;
  DriveScore score(b);
  Stream{}.feed(score, [](double t, PlantRow& plant, std::vector<Estimate<double>>&, bool&) {
    plant[P::speed_reference_rpm] = no_number;
    plant[P::speed_rpm] = t < 0.5005 ? 1490.0 : 1450.0;
  });
  const DriveFigures f = score.figures();
  CHECK_FALSE(f.speed_tracking_rmse_rpm);
  CHECK_FALSE(f.recovery_s);
  CHECK_FALSE(f.voltage_clipped_fraction);
  CHECK(*f.load_dip_rpm == 40.0);
}

TEST_CASE("drive score: copper loss equals the equivalent circuit's", "[score][closed_form]") {
  // Steady state at 60 Hz, slip 0.05, by the circuit's complex impedances: P = 3 (R_s I_s^2 + R_r I_r^2) with rms currents.
  // The circuit is the per-phase T form of any text on machines.
  const ScoreBasis b = basis();
  const auto& c = b.circuit;
  using Complex = std::complex<double>;
  const double w = 2.0 * pi * 60.0, slip = 0.05;
  const Complex j(0, 1), z_m = j * w * c.magnetizing_inductance,
                         z_r = c.rotor_resistance / slip + j * w * c.rotor_leakage;
  const Complex z = c.stator_resistance + j * w * c.stator_leakage + z_m * z_r / (z_m + z_r);
  const Complex i_s = 127.0 / z, i_r = -i_s * z_m / (z_m + z_r);  // rms; the rotor current into its terminals
  const double loss = 3.0 * (c.stator_resistance * std::norm(i_s) + c.rotor_resistance * std::norm(i_r));
  const Complex psi_r = (c.rotor_inductance() * i_r + c.magnetizing_inductance * i_s) * std::sqrt(2.0);
  const Complex seen = i_s * std::sqrt(2.0) * std::conj(psi_r) / std::abs(psi_r);
  DriveScore score(b);
  Stream{}.feed(score, [&](double, PlantRow& plant, std::vector<Estimate<double>>&, bool&) {
    plant[P::i_d] = seen.real(), plant[P::i_q] = seen.imag();
    plant[P::rotor_flux] = std::abs(psi_r);
    plant[P::stator_resistance] = c.stator_resistance, plant[P::rotor_resistance] = c.rotor_resistance;
  });
  CHECK(*score.figures().copper_loss_W == Approx(loss).epsilon(rounding));
}
