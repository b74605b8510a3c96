// The order of things in a run: when a voltage acts, what sensors see at a jump, what noise the plant is driven with, and
// that a steady start is one.
#include <catch2/catch.hpp>
#include <cmath>
#ifdef __SSE2__
#include <xmmintrin.h>
#endif

#include "sim/engine/simulate.hpp"
#include "sim/scenario/input_error.hpp"
#include "tests/published/machines.hpp"

using namespace slipbench;
using published::krause_3hp;

namespace {

constexpr double T = 100e-6;

// Every row of plant, measured and estimator columns; a row is a control tick here.
struct Log : RunObserver {
  std::vector<PlantRow> plant;
  std::vector<std::vector<double>> measured, estimates;
  void trace_row(const RowView& v) override {
    plant.push_back(*v.plant);
    measured.emplace_back(v.measured.begin(), v.measured.end());
    estimates.emplace_back(v.estimates.begin(), v.estimates.end());
  }
};
Log log_of(const Scenario& s) {
  Log log;
  RunObserver* observer = &log;
  simulate(s, {&observer, 1});
  return log;
}

// Krause 3 hp on an ideal inverter, no noise, magnetised, ideal speed sensor; measured columns: i_a, i_b, i_c, DC link, speed.
Scenario drive(double duration_s, double period_s = T) {
  Scenario s = published::on_mains(krause_3hp(), duration_s, period_s / 5.0);
  s.run.control_period_s = s.run.trace_period_s = period_s;
  s.run.start = "magnetised";
  s.supply = {};
  s.supply.kind = "inverter";
  s.supply.dc_link_V = 310.0;
  s.supply.switching_frequency_Hz = 1.0 / period_s;
  s.supply.zero_current_width_A = 0.2;
  s.sensors.current.present = s.sensors.dc_link.present = true;
  s.sensors.speed.kind = "ideal";
  s.controller.kind = "rotor_flux_oriented";
  s.reference.rotor_flux_Wb = 0.44;
  s.reference.speed_rpm = {{0.0, 0.0}};
  return s;
}
void impose(Scenario& s, Knots speed_rpm) {
  LoadSettings dynamometer;
  dynamometer.kind = "imposed_speed";
  dynamometer.speed_rpm = std::move(speed_rpm);
  s.loads = {dynamometer};
}
void load(Scenario& s, Knots torque_Nm) {
  LoadSettings profile;
  profile.kind = "profile";
  profile.torque_profile = std::move(torque_Nm);
  s.loads = {profile};
}
void ride(Scenario& s) {
  for (const char* kind : {"luenberger", "reduced_order", "extended_kalman"}) {
    EstimatorSettings e;
    e.name = e.kind = kind;
    s.estimators.push_back(e);
  }
}

}  // namespace

TEST_CASE("run: what is computed at tick k acts from tick k + d on", "[engine][run]") {
  constexpr std::size_t step_at = 200;
  for (const std::int64_t d : {0, 1, 2}) {
    Scenario s = drive(0.03);
    s.run.start = "steady";
    impose(s, {{0.0, 0.0}});
    s.controller.delay_periods = d;
    s.reference.speed_rpm = {};
    s.reference.torque_Nm = {{0.0, 0.0}, {step_at * T, 0.0}, {step_at * T, 5.0}};
    const Log log = log_of(s);
    std::size_t first = 0;
    // At rest nothing moves by more than a steady start allows (1e-7 of 180 V); the step asks for volts.
    while (first < log.plant.size() && std::fabs(log.plant[first][P::u_beta] - log.plant[0][P::u_beta]) < 1e-3) ++first;
    CHECK(first == step_at + static_cast<std::size_t>(d));
  }
}

TEST_CASE("run: estimators are told the voltage of the period that ends at their tick", "[engine][run]") {
  // Told that of a neighbouring period, the flux would be off by w T: 1.3 degrees at 36 Hz. What the method leaves there is its
  // trapezoid, (w T)^2 / 12 = 4e-5 rad of the leakage's share.
  for (const std::int64_t d : {0, 1, 2}) {
    Scenario s = drive(0.2);
    s.run.start = "steady";
    s.controller.delay_periods = d;
    s.reference.speed_rpm = {{0.0, 1000.0}};
    load(s, {{0.0, 8.0}});
    ride(s);
    const Log log = log_of(s);
    for (std::size_t e = 0; e < 3; ++e) {
      const double off = log.estimates.back()[5 * e + 2] - log.plant.back()[P::rotor_flux_angle];
      INFO("delay " << d << ", estimator " << e);
      CHECK(std::fabs(std::sin(off)) < 1e-4);
    }
  }
}

TEST_CASE("run: at a jump sensors and row show the value just after it", "[engine][run]") {
  constexpr std::size_t at = 100;
  const Knots step{{0.0, 1.0}, {at * T, 1.0}, {at * T, 0.8}};
  for (const char* quantity : {"dc_link", "stator_leakage", "magnetizing_inductance"}) {
    Scenario s = drive(0.02);
    s.drifts.push_back({quantity, step});
    const Log log = log_of(s);
    INFO(quantity);
    for (const std::size_t k : {at - 1, at, at + 1}) {
      CHECK(log.measured[k][0] == log.plant[k][P::i_a]);
      CHECK(log.measured[k][3] == log.plant[k][P::dc_link]);
    }
  }
  Scenario s = drive(0.02);
  impose(s, {{0.0, 100.0}, {at * T, 100.0}, {at * T, 300.0}});
  const Log log = log_of(s);
  CHECK(log.plant[at - 1][P::speed_rpm] == Approx(100.0));
  CHECK(log.plant[at][P::speed_rpm] == Approx(300.0));
  CHECK(log.measured[at][4] == log.plant[at][P::speed_rpm]);
}

TEST_CASE("run: a knot acts at its tick whatever the rounding of k T", "[engine][run]") {
  // 150 us in binary lies below 150e-6, so that k T falls short of every other decimal time by a rounding.
  constexpr double period = 150e-6;
  int short_of = 0;
  for (int k = 20; k < 40; ++k) {
    const double time = k * 15 / 1e5;
    short_of += k * period < time ? 1 : 0;
    Scenario s = drive(60 * period, period);
    s.reference.speed_rpm = {{0.0, 0.0}, {time, 0.0}, {time, 50.0}};
    s.drifts.push_back({"rotor_resistance", {{0.0, 1.0}, {time, 1.0}, {time, 1.5}}});
    const Log log = log_of(s);
    const auto n = static_cast<std::size_t>(k);
    INFO("tick " << k);
    CHECK(log.plant[n - 1][P::speed_reference_rpm] == 0.0);
    CHECK(log.plant[n][P::speed_reference_rpm] == Approx(50.0));
    CHECK(log.plant[n - 1][P::rotor_resistance] == 0.816);
    CHECK(log.plant[n][P::rotor_resistance] == Approx(1.5 * 0.816));
  }
  CHECK(short_of > 0);  // the case was met
}

TEST_CASE("run: process noise has the rms it is given", "[engine][run]") {
  // Current and flux: with noise and without, two runs part by it alone at tick 1; each seed gives another pair of draws.
  double current = 0.0, flux = 0.0;
  constexpr int draws = 200;
  for (int seed = 0; seed < draws; ++seed) {
    Scenario s = drive(T);
    s.seed = static_cast<std::uint64_t>(seed);
    const PlantRow quiet = log_of(s).plant[1];
    s.process_noise.current_A = 0.2;
    s.process_noise.flux_Wb = 1e-3;
    const PlantRow noisy = log_of(s).plant[1];
    current += (std::pow(noisy[P::i_alpha] - quiet[P::i_alpha], 2) + std::pow(noisy[P::i_beta] - quiet[P::i_beta], 2)) /
               (2 * draws);
    flux += std::pow(noisy[P::rotor_flux] - quiet[P::rotor_flux], 2) / draws;  // its alpha part: the flux lies there
  }
  CHECK(std::sqrt(current) == Approx(0.2).epsilon(2.0 * std::sqrt(2.0 / (2 * draws))));  // bound as below
  CHECK(std::sqrt(flux) == Approx(1e-3).epsilon(2.0 * std::sqrt(2.0 / draws)));

  Scenario s = drive(1.0);
  s.process_noise.load_torque_Nm = 3.0;
  const Log log = log_of(s);
  const auto n = log.plant.size() - 1;
  // The walk of the load: independent steps of 3 sqrt(T).
  double walk = 0.0;
  for (std::size_t k = 1; k <= n; ++k) {
    const double step = log.plant[k][P::load_torque] - log.plant[k - 1][P::load_torque];
    walk += step * step / static_cast<double>(n);
  }
  // Four standard deviations of a variance from n normal numbers: 4 sqrt(2 / n) of it, half that of the rms.
  const double bound = 2.0 * std::sqrt(2.0 / static_cast<double>(n));
  CHECK(std::sqrt(walk) == Approx(3.0 * std::sqrt(T)).epsilon(bound));
}

TEST_CASE("run: a steady start stands still from the first tick on, with every estimator settled", "[engine][run]") {
  struct Case {
    double speed_rpm, load_Nm;
  };
  for (const Case& c : {Case{1000.0, 8.0}, Case{-1000.0, 8.0}, Case{1000.0, -8.0}, Case{2500.0, 5.0}}) {
    Scenario s = drive(0.1);
    s.run.start = "steady";
    s.reference.speed_rpm = {{0.0, c.speed_rpm}};
    load(s, {{0.0, c.load_Nm}});
    ride(s);
    const Log log = log_of(s);
    INFO(c.speed_rpm << " rpm, " << c.load_Nm << " N m");
    for (const std::size_t k : {std::size_t{0}, log.plant.size() - 1}) {
      CHECK(log.plant[k][P::speed_rpm] == Approx(c.speed_rpm).epsilon(1e-6));  // a run-in's own bound is 1e-7 of rated
      CHECK(log.plant[k][P::torque] == Approx(c.load_Nm).epsilon(2e-3));  // it ripples within a period of held voltage
      // The methods' own steps: 2e-5 of the speed at 130 Hz, and 1e-4 for what the run-in left.
      for (std::size_t e = 0; e < 3; ++e) CHECK(log.estimates[k][5 * e] == Approx(c.speed_rpm).epsilon(1e-4));
    }
  }
  // Magnetised on a shaft that a dynamometer turns: the voltage that holds the flux stands from the start, no torque.
  Scenario turned = drive(0.005);
  turned.reference.speed_rpm = {};
  turned.reference.torque_Nm = {{0.0, 0.0}};
  impose(turned, {{0.0, 1000.0}});
  // A period of the missing back-EMF would be 17 N m; held voltage and its own settling leave a hundredth.
  for (const PlantRow& row : log_of(turned).plant) CHECK(std::fabs(row[P::torque]) < 0.17);
  // A machine that has drifted before t = 0 starts in the equilibrium it has then.
  Scenario s = published::on_mains(krause_3hp(), 0.1, 20e-6);
  s.run.start = "steady";
  load(s, {{0.0, 10.0}});
  s.drifts.push_back({"rotor_resistance", {{0.0, 1.5}}});
  const Log log = log_of(s);
  CHECK(log.plant.front()[P::speed_rpm] == Approx(log.plant.back()[P::speed_rpm]).epsilon(1e-9));
  CHECK(log.plant.back()[P::torque] == Approx(10.0).epsilon(1e-8));
}

#ifdef __SSE2__
TEST_CASE("run: a processor that flushes denormals is refused", "[engine][run]") {
  const Scenario s = drive(0.001);
  const unsigned before = _mm_getcsr();
  for (const unsigned bit : {0x8000u, 0x0040u}) {  // flush to zero; denormals are zero (Intel's manual, MXCSR)
    bool refused = false;
    _mm_setcsr(before | bit);
    try {
      log_of(s);
    } catch (const OutsideError&) {
      refused = true;
    }
    _mm_setcsr(before);
    CHECK(refused);
  }
  CHECK_NOTHROW(log_of(s));
}
#endif

TEST_CASE("run: volts per hertz starts from standstill, magnetised and steady, and blind", "[engine][run]") {
  for (const char* start : {"standstill", "magnetised", "steady"}) {
    Scenario s = drive(3.0);
    s.run.start = start;
    s.run.trace_period_s = 1e-2;
    s.controller.kind = "volts_per_hertz";
    s.sensors.speed.kind = "none";
    const bool steady = s.run.start == "steady";
    s.reference.speed_rpm = {{0.0, steady ? 1000.0 : 0.0}, {0.5, steady ? 1000.0 : 0.0}, {1.5, 1000.0}};
    load(s, {{0.0, steady ? 8.0 : 0.0}, {1.5, steady ? 8.0 : 0.0}, {1.6, 8.0}});
    const Log log = log_of(s);
    INFO(start);
    // What is left after 1.4 s of the slip filter's 0.24 s: e^-5 of 50 rpm.
    CHECK(log.plant.back()[P::speed_rpm] == Approx(1000.0).margin(steady ? 0.01 : 1.0));
    if (!steady) continue;
    for (const PlantRow& row : log.plant)
      CHECK(row[P::speed_rpm] == Approx(1000.0).margin(0.01));  // 1e-6 a control tick
  }
}
