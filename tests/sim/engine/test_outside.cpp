// A controller outside the simulation: what it is told, when what it says acts, and gates that open, against closed forms.
#include <catch2/catch.hpp>
#include <cmath>
#include <functional>

#include "sim/engine/simulate.hpp"
#include "sim/score/estimator_score.hpp"
#include "tests/published/sensorless_drive.hpp"

using namespace slipbench;
using namespace slipbench::published;

namespace {

constexpr double T = 100e-6;

struct Told {
  OutsideView view;
  std::vector<double> readings;
};

// Answers with what a function of the tick says, and keeps what it was told.
struct Script final : OutsideController {
  std::function<OutsideAct(std::int64_t)> says = [](std::int64_t) { return OutsideAct{}; };
  std::vector<Told> told;
  std::vector<ActedEvent> log;
  OutsideAct step(const OutsideView& view) override {
    told.push_back({view, {view.readings.begin(), view.readings.end()}});
    return says(view.tick);
  }
  [[nodiscard]] std::vector<ActedEvent> events() const override { return log; }
};

// A row is a control tick here.
struct Log : RunObserver {
  std::vector<PlantRow> plant;
  std::vector<std::vector<double>> measured, estimates;
  RunOutcome outcome;
  void trace_row(const RowView& v) override {
    plant.push_back(*v.plant);
    measured.emplace_back(v.measured.begin(), v.measured.end());
    estimates.emplace_back(v.estimates.begin(), v.estimates.end());
  }
};
Log log_of(const Scenario& s, OutsideController& outside) {
  Log log;
  RunObserver* observer = &log;
  RunOptions options;
  options.outside = &outside;
  log.outcome = simulate(s, {&observer, 1}, options);
  return log;
}

// Krause 3 hp on an inverter, magnetised, the shaft held at `rpm`.
Scenario held(double rpm, double duration_s) {
  Scenario s = inverter_drive(krause_3hp(), 0.6, 0.0, "measured");
  s.run.duration_s = duration_s;
  s.run.trace_period_s = T;
  LoadSettings dynamometer;
  dynamometer.kind = "imposed_speed";
  dynamometer.speed_rpm = {{0.0, rpm}};
  s.loads = {dynamometer};
  s.estimators.clear();
  return s;
}

OutsideAct open() {
  OutsideAct act;
  act.gates = false;
  return act;
}

}  // namespace

// Krause ch. 4 with i_s = 0: psi_r(t) = psi_r(0) e^(-t / tau_r) e^(j p w t), u = (L_m / L_r) (-1/tau_r + j p w) psi_r.
TEST_CASE("open gates: the rotor flux decays with the rotor time constant and turns with the shaft",
          "[sim/engine][published]") {
  const Published p = krause_3hp();
  const double tau = p.circuit.rotor_inductance() / p.circuit.rotor_resistance;
  const double w = p.circuit.pole_pairs * 900.0 * rad_s_in_rpm,
               ratio = p.circuit.magnetizing_inductance / p.circuit.rotor_inductance();
  Script script;
  script.says = [](std::int64_t) { return open(); };
  const Log log = log_of(held(900.0, 0.3), script);
  REQUIRE(log.plant.size() == 3001);
  const double flux = log.plant[0][P::rotor_flux];
  for (std::size_t k = 0; k < log.plant.size(); k += 7) {
    const PlantRow& row = log.plant[k];
    const double t = static_cast<double>(k) * T, expected = flux * std::exp(-t / tau);
    // Fourth-order steps of 20 us against 2 ms of turning: (w h)^5 / 120 a step, 1e-10 over the run; asked for with room.
    CHECK(row[P::rotor_flux] == Approx(expected).epsilon(1e-8));
    CHECK(std::fabs(std::remainder(row[P::rotor_flux_angle] - w * t, 2.0 * pi)) < 1e-7);
    const double u = std::hypot(row[P::u_alpha], row[P::u_beta]);
    CHECK(u == Approx(ratio * expected * std::hypot(w, 1.0 / tau)).epsilon(1e-8));
    // Two numbers of 100 A that cancel, in double.
    CHECK(std::fabs(row[P::i_a]) < 1e-10);
    CHECK(std::fabs(row[P::i_b]) < 1e-10);
    CHECK(std::fabs(row[P::torque]) < 1e-9);
  }
}

// J dw/dt = -B w - T: w(t) = (w_0 + T/B) e^(-B t / J) - T/B.
TEST_CASE("open gates: the shaft coasts by viscous friction and load alone", "[sim/engine]") {
  Scenario s = held(0.0, 0.3);
  s.run.start = "standstill";
  s.run.initial_speed_rpm = 900.0;
  s.shaft.viscous_friction_Nms = 0.02;
  LoadSettings load;
  load.kind = "profile";
  load.torque_profile = {{0.0, 1.5}};
  s.loads = {load};
  Script script;
  script.says = [](std::int64_t) { return open(); };
  const Log log = log_of(s, script);
  const double B = 0.02, J = s.shaft.inertia_kgm2, w0 = 900.0 * rad_s_in_rpm;
  for (std::size_t k = 0; k < log.plant.size(); k += 50) {
    const double t = static_cast<double>(k) * T;
    const double w = (w0 + 1.5 / B) * std::exp(-B * t / J) - 1.5 / B;
    // A fourth-order step of something that is all but a straight line: rounding only.
    CHECK(log.plant[k][P::speed_rpm] == Approx(w / rad_s_in_rpm).epsilon(1e-10).margin(1e-8));
  }
}

TEST_CASE("open gates: act at the tick that says so; enabled again, the machine takes current again", "[sim/engine]") {
  Script script;
  script.says = [](std::int64_t k) {
    OutsideAct act;
    act.duty = {0.52, 0.49, 0.49};
    act.gates = k < 100 || k >= 200;
    return act;
  };
  const Log log = log_of(held(0.0, 0.03), script);
  const auto current = [&](std::size_t k) { return std::fabs(log.plant[k][P::i_a]); };
  // A row is told after the tick's commands have acted: tick 100 shows the open stator, with the rotor flux where it was.
  CHECK(current(99) > 0.1);
  for (std::size_t k = 100; k < 200; ++k) CHECK(current(k) < 1e-10);
  CHECK(current(203) > 0.01);
  // In one tick at standstill it decays by T / tau_r, 0.07 %; nothing jumps.
  CHECK(log.plant[100][P::rotor_flux] == Approx(log.plant[99][P::rotor_flux]).epsilon(2e-3));
}

TEST_CASE("duties from outside act delay_periods later, over one period", "[sim/engine]") {
  for (const std::int64_t delay : {0, 1, 2}) {
    Scenario s = held(0.0, 0.002);
    s.run.start = "standstill";
    s.supply.dead_time_s = s.supply.device_drop_V = 0.0;
    s.controller.delay_periods = delay;
    Script script;
    script.says = [](std::int64_t k) {
      OutsideAct act;
      if (k == 5) act.duty = {0.6, 0.45, 0.45};
      return act;
    };
    const Log log = log_of(s, script);
    for (std::size_t k = 0; k < 15; ++k) {
      // 2/3 (0.6 - 0.45) V_dc
      const double expected = k == 5 + static_cast<std::size_t>(delay) ? 2.0 / 3.0 * 0.15 * s.supply.dc_link_V : 0.0;
      CHECK(log.plant[k][P::u_alpha] == Approx(expected).epsilon(1e-12).margin(1e-9));
    }
  }
}

TEST_CASE("outside: told the readings that the trace shows, references, and an encoder's count", "[sim/engine]") {
  Scenario s = held(600.0, 0.1);
  s.sensors.speed.kind = "encoder";
  s.sensors.speed.lines_per_rev = 1000;
  s.reference.speed_rpm = {{0.0, 0.0}, {0.05, 300.0}};
  Script script;
  const Log log = log_of(s, script);
  REQUIRE(script.told.size() == log.measured.size());
  for (std::size_t k = 0; k < script.told.size(); ++k) {
    const Told& told = script.told[k];
    CHECK(told.view.tick == static_cast<std::int64_t>(k));
    CHECK(told.readings == log.measured[k]);
    const double t = static_cast<double>(k) * T;
    CHECK(told.view.speed_reference_rad_s == Approx(std::fmin(t / 0.05, 1.0) * 300.0 * rad_s_in_rpm).margin(1e-9));
    // 10 turns a second of 4000 edges; an edge that falls on the tick may round either way.
    CHECK(std::fabs(told.view.encoder_edges - std::floor(40000.0 * t)) <= 1.0);
  }
}

TEST_CASE("outside: its estimates are those of one more estimator, called board, and scored", "[sim/engine]") {
  Scenario s = inverter_drive(krause_3hp(), 0.6, 0.0, "luenberger");
  s.run.duration_s = 0.05;
  s.run.trace_period_s = T;
  Script script;
  script.says = [](std::int64_t k) {
    OutsideAct act;
    act.estimate.speed = static_cast<double>(k);
    act.estimate.torque = -1.0;
    return act;
  };
  script.log = {{3, 3 * T, "something"}};
  Scenario told = s;
  told.estimators.emplace_back().name = "board";
  EstimatorScore score(score_basis(told));
  Log log;
  RunObserver* observers[] = {&score, &log};
  RunOptions options;
  options.outside = &script;
  const RunOutcome outcome = simulate(s, observers, options);
  REQUIRE(log.estimates[0].size() == 5 * 4);
  CHECK(log.estimates[30][15] == Approx(30.0 / rad_s_in_rpm));
  CHECK(log.estimates[30][18] == -1.0);
  REQUIRE(outcome.events.size() == 1);
  CHECK(outcome.events[0].what == "something");
  // At rest, so the error is the estimate: the mean of 0 to 500 rad/s.
  CHECK(score.figures()[3].speed_bias_rpm.value() == Approx(250.0 / rad_s_in_rpm).epsilon(1e-3));
}

TEST_CASE("an open machine above the DC link is said to be beyond the model", "[sim/engine]") {
  for (const bool beyond : {false, true}) {
    Scenario s = held(beyond ? 1700.0 : 900.0, 0.01);
    s.supply.dc_link_V = 200.0;  // rated: 220 V line to line, 311 V peak, at 1710 rpm
    Script script;
    script.says = [](std::int64_t) { return open(); };
    const Log log = log_of(s, script);
    CHECK(log.outcome.events.size() == (beyond ? 1 : 0));
  }
}
