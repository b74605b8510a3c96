// Timed events: when they act, what failing sensors then tell, and who gives the controller its speed.
#include <catch2/catch.hpp>
#include <cmath>

#include "sim/engine/simulate.hpp"
#include "tests/published/sensorless_drive.hpp"

using namespace slipbench;
using namespace slipbench::published;

namespace {

constexpr double T = 100e-6;

// A row is a control tick here.
struct Log : RunObserver {
  std::vector<PlantRow> plant;
  std::vector<std::vector<double>> measured;
  RunOutcome outcome;
  void trace_row(const RowView& v) override {
    plant.push_back(*v.plant);
    measured.emplace_back(v.measured.begin(), v.measured.end());
  }
};
Log log_of(const Scenario& s) {
  Log log;
  RunObserver* observer = &log;
  log.outcome = simulate(s, {&observer, 1});
  return log;
}

// Krause 3 hp on mains, where nothing hangs on a sensor; the shaft is held at `rpm`. Measured: i_a, i_b, i_c, speed.
Scenario held(double rpm, double duration_s, const char* speed_sensor) {
  Scenario s = on_mains(krause_3hp(), duration_s, 20e-6);
  s.run.control_period_s = s.run.trace_period_s = T;
  LoadSettings dynamometer;
  dynamometer.kind = "imposed_speed";
  dynamometer.speed_rpm = {{0.0, rpm}};
  s.loads = {dynamometer};
  s.sensors.speed.kind = speed_sensor;
  return s;
}

// 0.6 of rated speed and a load, in closed loop over an encoder; estimators as in inverter_drive.
Scenario closed_loop(double duration_s) {
  const Published p = krause_3hp();
  Scenario s = inverter_drive(p, 0.6, 0.5 * p.torque, "measured");
  s.run.duration_s = duration_s;
  s.run.trace_period_s = T;
  s.run.start = "steady";
  s.reference.speed_rpm = {{0.0, 0.6 * p.speed_rpm}};
  s.loads[0].torque_profile = {{0.0, 0.5 * p.torque}};
  s.sensors.speed.kind = "encoder";
  return s;
}

bool same(const std::vector<double>& a, const std::vector<double>& b) {
  for (std::size_t i = 0; i < a.size(); ++i) {
    if (!(a[i] == b[i] || (a[i] != a[i] && b[i] != b[i]))) return false;
  }
  return a.size() == b.size();
}
bool same(const PlantRow& a, const PlantRow& b) {
  return same(std::vector<double>(a.begin(), a.end()), std::vector<double>(b.begin(), b.end()));
}

}  // namespace

TEST_CASE("events: a dead encoder reads at most one edge over the silence, and 0 from its timeout",
          "[engine][events]") {
  // The law in encoder.hpp. 300 rpm and 1024 lines: an edge each 48.8 us, so the last one came that much before the event at
  // most; a clock count (0.1 us) either way besides. The window, 1 ms, is ten ticks; the event falls into the middle of one.
  Scenario s = held(300.0, 0.2, "encoder");
  s.events = {{0.0505, "speed_sensor_fault", "no_signal", "", ""}};
  const Log log = log_of(s);
  const double edge = 2.0 * pi / 4096.0, count = 1e-7, per_edge = 60.0 / 300.0 / 4096.0;
  for (std::size_t k = 0; k < log.measured.size(); ++k) {
    const double speed = log.measured[k][3] * pi / 30.0, window_end = static_cast<double>(k / 10 * 10) * T;
    INFO("tick " << k << ", " << speed << " rad/s");
    if (window_end <= 0.0510 + 1e-9) {
      CHECK(speed == Approx(10.0 * pi).epsilon(2.0 / (10e6 * 0.5e-3)));  // two counts over half a window
      continue;
    }
    const double shortest = window_end - 0.0505 - count, longest = window_end - 0.0505 + per_edge + count;
    if (shortest >= 0.1) {
      CHECK(speed == 0.0);
    } else {
      CHECK(speed <= edge / shortest);
      CHECK(speed >= (longest >= 0.1 ? 0.0 : edge / longest));
    }
  }
  CHECK(log.measured[1500][3] > 0.0);  // 0.1 s of silence are over at 0.1505 s: the window that ends at 0.151 s
  CHECK(log.measured[1510][3] == 0.0);
}

TEST_CASE("events: ideal sensor and tachogenerator read 0 without a signal; stuck keeps the last reading",
          "[engine][events]") {
  for (const char* kind : {"ideal", "tachogenerator", "encoder"}) {
    INFO(kind);
    Scenario s = held(300.0, 0.05, kind);
    s.loads[0].speed_rpm = {{0.0, 300.0}, {0.05, 600.0}};
    s.sensors.speed.noise_rpm = 1.0;
    const Log whole = log_of(s);
    s.events = {{0.02, "speed_sensor_fault", "stuck", "", ""}, {0.03, "speed_sensor_fault", "repaired", "", ""}};
    const Log stuck = log_of(s);
    for (std::size_t k = 0; k < whole.measured.size(); ++k) {
      CHECK(stuck.measured[k][3] == whole.measured[k >= 200 && k < 300 ? 199 : k][3]);
    }
    if (std::string(kind) == "encoder") continue;
    s.events = {{0.02, "speed_sensor_fault", "no_signal", "", ""}, {0.03, "speed_sensor_fault", "repaired", "", ""}};
    const Log dead = log_of(s);
    for (std::size_t k = 0; k < whole.measured.size(); ++k)
      CHECK(dead.measured[k][3] == (k >= 200 && k < 300 ? 0.0 : whole.measured[k][3]));
  }
}

TEST_CASE("events: an encoder that comes back counts from there, and never reads too much", "[engine][events]") {
  for (const double silence : {0.0123, 0.12}) {  // before and after its timeout
    Scenario s = held(-700.0, 0.2, "encoder");
    s.events = {{0.03, "speed_sensor_fault", "no_signal", "", ""},
                {0.03 + silence, "speed_sensor_fault", "repaired", "", ""}};
    const Log log = log_of(s);
    for (const auto& row : log.measured) {
      CHECK(row[3] <= 0.0);
      CHECK(row[3] >= -700.0 * (1.0 + 2.0 / (10e6 * 0.5e-3)));  // two counts over half a window
    }
    // Two windows after, the reading is the speed again.
    const auto back = static_cast<std::size_t>((0.03 + silence) / T) + 30;
    CHECK(log.measured[back][3] == Approx(-700.0).epsilon(2.0 / (10e6 * 0.5e-3)));
  }
}

TEST_CASE("events: a fault in phase a is seen in its reading alone", "[engine][events]") {
  Scenario s = held(1700.0, 0.4, "ideal");
  s.run.start = "standstill";
  s.sensors.current.noise = 0.2;
  s.sensors.current.offset = {0.5, 0.1, -0.1};
  s.sensors.current.bits = 12;
  s.sensors.current.range = 204.8;  // lsb 0.1 A
  const Log whole = log_of(s);
  s.events = {{0.1, "current_sensor_fault", "no_signal", "a", ""},
              {0.3, "current_sensor_fault", "stuck", "a", ""},
              {0.35, "current_sensor_fault", "repaired", "a", ""}};
  const Log log = log_of(s);
  double sum = 0.0, squares = 0.0;
  for (std::size_t k = 0; k < log.measured.size(); ++k) {
    CHECK(same(log.plant[k], whole.plant[k]));
    for (std::size_t i = 1; i < 4; ++i) CHECK(log.measured[k][i] == whole.measured[k][i]);
    const double i_a = log.measured[k][0];
    if (k < 1000 || k >= 3500) CHECK(i_a == whole.measured[k][0]);
    if (k >= 3000 && k < 3500) CHECK(i_a == log.measured[2999][0]);
    if (k < 1000 || k >= 3000) continue;
    sum += i_a, squares += i_a * i_a;
    CHECK(i_a / 0.1 == Approx(std::round(i_a / 0.1)).margin(1e-9));  // whole codes
  }
  // 2000 samples: offset and rms (noise and a code's 0.1/sqrt 12) to four times their standard errors, 0.0045 and 0.0032 A.
  const double mean = sum / 2000.0, rms = std::sqrt(squares / 2000.0 - mean * mean);
  CHECK(mean == Approx(0.5).margin(4 * 0.0045));
  CHECK(rms == Approx(std::sqrt(0.04 + 0.01 / 12.0)).margin(4 * 0.0032));
}

TEST_CASE("events: behind a filter a lost current fades with its time constant", "[engine][events]") {
  Scenario s = held(1700.0, 0.3, "ideal");
  s.sensors.current.bandwidth_Hz = 200.0;
  s.events = {{0.2, "current_sensor_fault", "no_signal", "b", ""}};
  const Log log = log_of(s);
  // From the first full step on it is exp(-2 pi f t), exactly; rounding of 50 products.
  const double first = log.measured[2001][1];
  CHECK(std::fabs(first) > 0.1);
  for (std::size_t k = 2001; k < 2060; ++k) {
    const double t = static_cast<double>(k - 2001) * T;
    CHECK(log.measured[k][1] == Approx(first * std::exp(-2.0 * pi * 200.0 * t)).epsilon(1e-12));
  }
}

TEST_CASE("events: what went before an event keeps its bits, and the log tells what acted and when",
          "[engine][events]") {
  Scenario s = closed_loop(0.06);
  const Log without = log_of(s);
  CHECK(without.outcome.events.empty());
  // Out of order in the file; two at one time, in file order; between ticks; 0.03 s / 100 us is no whole number in binary.
  s.events = {{0.05001, "speed_from", "", "", "luenberger"},
              {0.03, "speed_sensor_fault", "no_signal", "", ""},
              {0.0, "current_sensor_fault", "stuck", "c", ""},
              {0.0, "current_sensor_fault", "repaired", "c", ""},
              {0.06, "speed_from", "", "", "measured"}};
  const Log log = log_of(s);
  const auto& events = log.outcome.events;
  REQUIRE(events.size() == 5);
  const char* what[] = {"current sensor c: stuck", "current sensor c: repaired", "speed sensor: no signal",
                        "speed from luenberger", "speed from measured"};
  const std::int64_t ticks[] = {0, 0, 300, 501, 600};
  for (std::size_t i = 0; i < 5; ++i) {
    CHECK(events[i].what == what[i]);
    CHECK(events[i].tick == ticks[i]);
    CHECK(events[i].time_s == static_cast<double>(ticks[i]) * T);
  }
  for (std::size_t k = 0; k < 300; ++k) {
    CHECK(same(log.plant[k], without.plant[k]));
    CHECK(same(log.measured[k], without.measured[k]));
  }
  CHECK_FALSE(same(log.plant.back(), without.plant.back()));
}

TEST_CASE("events: an encoder fails; an estimator that takes over keeps the drive up", "[engine][events]") {
  const double rated = krause_3hp().speed_rpm;
  for (const char* source : {"luenberger", "reduced_order", "extended_kalman", "measured"}) {
    Scenario s = closed_loop(0.8);
    s.events = {{0.1, "speed_sensor_fault", "no_signal", "", ""}, {0.12, "speed_from", "", "", source}};
    const Log log = log_of(s);
    INFO(source << " ends at " << log.plant.back()[P::speed_rpm] << " rpm");
    const double off = std::fabs(log.plant.back()[P::speed_rpm] - 0.6 * rated) / rated;
    if (std::string(source) == "measured") {
      CHECK(off > 0.3);  // left to a sensor that says 0 the drive races off
    } else {
      CHECK_FALSE(log.outcome.diverged);
      CHECK(off < 0.01);  // what the project promises of a sensorless drive, steady
    }
  }
}
