// Speed sensors: encoder with M/T evaluation against what the shaft really did, tachogenerator against its statistics.
#include <catch2/catch.hpp>
#include <cmath>
#include <functional>
#include <vector>

#include "sim/engine/noise.hpp"
#include "sim/engine/speed_sensor.hpp"

using namespace slipbench;

namespace {

constexpr double pi = 3.14159265358979323846;

// A shaft whose angle is a given function of time, seen by a sensor: plant step 10 us, control period 100 us.
class Bench {
 public:
  static constexpr double h = 10e-6;
  static constexpr std::int64_t steps_per_tick = 10;

  Bench(const SpeedSensorData& data, std::function<double(double)> angle, double start_speed = 0.0,
        std::int64_t first_tick = 0)
      : angle_(std::move(angle)),
        tick_(first_tick),
        sensor_(prepare_speed_sensor(data, h)),
        timing_(speed_sensor_timing(data, steps_per_tick, h * steps_per_tick)),
        state_(begin_speed_sensor(sensor_, at(first_tick * steps_per_tick), start_speed, first_tick * steps_per_tick)) {
  }

  // One control period on; the speed read at its end.
  double next(double normal = 0.0) {
    for (std::int64_t n = tick_ * steps_per_tick; n < (tick_ + 1) * steps_per_tick; ++n) {
      const double before = at(n), after = at(n + 1);
      advance(state_, before, after, (after - before) / h, n, sensor_, timing_);
    }
    ++tick_;
    return read_speed(state_, tick_, normal, sensor_, timing_);
  }
  // Reads at every tick up to `time`.
  std::vector<double> until(double time) {
    std::vector<double> speeds;
    while (static_cast<double>(tick_) * h * steps_per_tick < time - h) speeds.push_back(next());
    return speeds;
  }

 private:
  [[nodiscard]] double at(std::int64_t n) const { return angle_(static_cast<double>(n) * h); }
  std::function<double(double)> angle_;
  std::int64_t tick_;
  SpeedSensor<double> sensor_;
  SpeedSensorTiming timing_;
  SpeedSensorState<double> state_;
};

SpeedSensorData encoder(std::int64_t lines = 1024, double clock_Hz = 10e6, double window_s = 1e-3,
                        double timeout_s = 0.1) {
  SpeedSensorData data;
  data.kind = SpeedSensorKind::encoder;
  data.encoder = {lines, clock_Hz, timeout_s};
  data.window_s = window_s;
  return data;
}

}  // namespace

TEST_CASE("encoder: constant speed is exact to the clock", "[engine][sensor]") {
  // Two times, each short by less than a count, at least half a window apart (and at least an edge):
  // relative error below 1 / (measured counts), measured >= f_c max(window / 2, edge) - 1.
  for (const double speed : {157.08, -157.08, 1.7, -0.9, 12.345}) {
    for (const double clock : {10e6, 1e6, 8.4e6}) {  // 8.4e6: 84 counts a step, 1e6: 10
      Bench bench(encoder(1024, clock), [&](double t) { return 0.1234 + speed * t; });
      const double edge_s = 2 * pi / 4096 / std::fabs(speed);
      const double counts = clock * std::max(0.5e-3, edge_s);
      const std::vector<double> read = bench.until(0.2);
      INFO("speed " << speed << ", clock " << clock);
      double worst = 0.0;
      for (std::size_t i = 100; i < read.size(); ++i) worst = std::max(worst, std::fabs(read[i] / speed - 1));
      CHECK(worst < 1 / (counts - 1));
    }
  }
}

TEST_CASE("encoder: its mean speed has no bias from quantising", "[engine][sensor]") {
  // Windows share their end edges, so the errors telescope: over M windows a mean weighted by time errs by one count
  // in all.
  const double speed = 33.3;
  Bench bench(
      encoder(512, 1e6), [&](double t) { return speed * t; }, speed);
  double sum = 0.0;
  int count = 0;
  for (const double read : bench.until(2.0)) {
    sum += read;
    ++count;
  }
  // Second order of the error of one window (500 counts at least) is what the unweighted mean keeps: 1/500^2, and the
  // telescoped remainder 2 counts of 2e6.
  CHECK(std::fabs(sum / count / speed - 1) < 4e-6 + 1e-6);
}

TEST_CASE("encoder: long runs lose no resolution", "[engine][sensor]") {
  // The same shaft, started at 0 and after 10 hours at 3000 rpm: within one count as in the first test, plus the
  // spacing of the angle itself, 1.9e-9 rad at 1.1e7 rad over the 0.3 rad of a window.
  const double speed = 314.0;
  const std::int64_t late = 360000000;  // ticks
  Bench bench(
      encoder(), [&](double t) { return speed * t; }, speed, late);
  for (const double read : bench.until(36000.05)) {
    REQUIRE(std::fabs(read / speed - 1) < 2 / (10e6 * 1e-3) + 2 * 1.9e-9 / 0.157);
  }
}

TEST_CASE("encoder: a start at speed, forwards, backwards or before t = 0, reads that speed at once",
          "[engine][sensor]") {
  for (const double speed : {100.0, -100.0, 0.4, -0.4}) {
    for (const std::int64_t first : {0, -5000}) {
      Bench bench(
          encoder(), [&](double t) { return 7.7 + speed * t; }, speed, first);
      const double edge_s = 2 * pi / 4096 / std::fabs(speed);
      // As above, with the first reference up to two counts off.
      const double bound = 2 / (10e6 * std::max(0.5e-3, edge_s) - 2);
      INFO("speed " << speed << ", first tick " << first);
      for (const double read : bench.until(static_cast<double>(first) * 1e-4 + 0.1)) {
        REQUIRE(std::fabs(read / speed - 1) < bound);
      }
    }
  }
}

TEST_CASE("encoder: below one edge a window the value holds, bounded by the silence", "[engine][sensor]") {
  // 0.2 rad/s, 4096 edges: one edge each 7.67 ms, windows of 1 ms. The shaft stops dead at 0.1 s.
  const double speed = 0.2, pitch = 2 * pi / 4096;
  Bench bench(encoder(), [&](double t) { return speed * std::min(t, 0.1); });
  const std::vector<double> read = bench.until(0.3);
  const double last_edge = std::floor(speed * 0.1 / pitch) * pitch / speed;
  for (std::size_t i = 0; i < read.size(); ++i) {
    const double t = static_cast<double>(i + 1) * 1e-4, window_end = std::floor(t / 1e-3 + 1e-6) * 1e-3;
    INFO("t = " << t);
    if (t > 0.02 && t < 0.1) REQUIRE(std::fabs(read[i] / speed - 1) < 1 / (10e6 * pitch / speed - 1));
    // One edge over a whole number of counts; rounding of one division in 77000 counts.
    const double counts = pitch * 10e6 / read[i];
    if (t > 0.02 && t < 0.1) REQUIRE(std::fabs(counts - std::round(counts)) < 1e-9);
    // After the stop no more than one edge over the silence, a count of 10 MHz let; zero after the timeout of 0.1 s.
    if (window_end > 0.1) REQUIRE(read[i] <= pitch / (window_end - last_edge - 1e-7));
    if (window_end > last_edge + 0.002 && t < 0.19) REQUIRE(read[i] > 0.0);
    if (window_end > last_edge + 0.1) REQUIRE(read[i] == 0.0);
  }
}

TEST_CASE("encoder: after a timeout the old edge is no reference", "[engine][sensor]") {
  // 50 rad/s, at rest from 0.5 s to 1 s, then 50 rad/s at once: from the second window on the speed is right, and the
  // first one does not spread its edges over the rest before.
  const double speed = 50.0;
  Bench bench(
      encoder(), [&](double t) { return 0.3 + speed * (std::min(0.5, t) + std::max(0.0, t - 1.0)); }, speed);
  const std::vector<double> read = bench.until(1.05);
  for (std::size_t i = 0; i < read.size(); ++i) {
    const double t = static_cast<double>(i + 1) * 1e-4;
    INFO("t = " << t);
    if (t > 0.6011 && t < 1.0009) REQUIRE(read[i] == 0.0);
    // First window: its own edges, at most one pitch (30 us at this speed) short of it: still one count over 0.9 ms.
    if (t > 1.0011) REQUIRE(std::fabs(read[i] / speed - 1) < 2 / (10e6 * 0.9e-3));
  }
}

TEST_CASE("encoder: one lone edge after rest tells nothing, the next one does", "[engine][sensor]") {
  const double pitch = 2 * pi / 4096, speed = pitch / 5e-3;  // an edge each 5 ms
  Bench bench(encoder(), [&](double t) { return 0.5 * pitch + speed * std::max(0.0, t - 0.5); });
  const std::vector<double> read = bench.until(0.52);
  for (std::size_t i = 0; i < read.size(); ++i) {
    const double t = static_cast<double>(i + 1) * 1e-4;
    INFO("t = " << t);
    if (t < 0.5075) REQUIRE(read[i] == 0.0);  // edges at 0.5025 and 0.5075
    if (t > 0.5086) REQUIRE(std::fabs(read[i] / speed - 1) < 1 / (10e6 * 5e-3 - 1));
  }
}

TEST_CASE("encoder: reversal is followed with the right sign", "[engine][sensor]") {
  // Speed falls from +20 to -20 rad/s in 40 ms. A window's mean lies within the speeds met since the reference edge:
  // 1000 rad/s2 over the window, the time back to the reference edge (one more window or one edge's time near
  // standstill), and a control period's hold.
  const double a = 1000.0;
  Bench bench(
      encoder(), [&](double t) { return 20.0 * t - 0.5 * a * t * t; }, 20.0);
  const std::vector<double> read = bench.until(0.04);
  const double pitch = 2 * pi / 4096;
  double worst = 0.0;
  for (std::size_t i = 20; i < read.size(); ++i) {
    const double t = static_cast<double>(i + 1) * 1e-4, speed = 20.0 - a * t;
    worst = std::max(worst, std::fabs(read[i] - speed));
  }
  // Longest time without an edge, about the turning point: 2 sqrt(2 pitch / a) at most.
  CHECK(worst < a * (2e-3 + 2 * std::sqrt(2 * pitch / a)));
  CHECK(read.front() > 15.0);
  CHECK(read.back() < -15.0);
}

TEST_CASE("encoder: trembling about an edge is no speed", "[engine][sensor]") {
  const double pitch = 2 * pi / 4096;
  for (const double amplitude : {0.4, 0.9}) {  // of an edge; the shaft sits on edge 100
    Bench bench(encoder(), [&](double t) { return pitch * (100 + amplitude * std::sin(2 * pi * 731.0 * t)); });
    // Only edge 100 is ever crossed: net motion between crossings is none.
    for (const double read : bench.until(0.2)) REQUIRE(read == 0.0);
  }
  // Over two edges: the net motion is at most one edge, over the time between the crossings seen.
  Bench bench(encoder(), [&](double t) { return pitch * (100.5 + 0.7 * std::sin(2 * pi * 90.0 * t)); });
  const double crossing = 2 * std::asin(0.5 / 0.7) / (2 * pi * 90.0);  // from edge 100 to 101
  double sum = 0.0;
  for (const double read : bench.until(1.0)) {
    REQUIRE(std::fabs(read) <= pitch / (crossing - 20e-6));  // straight lines over a step of 10 us at either end
    sum += read;
  }
  CHECK(std::fabs(sum / 10000) < 0.05 * pitch / crossing);  // no drift: a twentieth of one such reading
}

TEST_CASE("encoder: many edges in one plant step, and a step that ends on an edge", "[engine][sensor]") {
  // 20000 lines at 6000 rpm: 80 edges a step, and angles that are whole edges at every step.
  const double pitch = 2 * pi / 80000, speed = 80 * pitch / Bench::h;
  Bench bench(encoder(20000), [&](double t) { return pitch * std::round(80 * t / Bench::h); });
  const std::vector<double> read = bench.until(0.02);
  for (std::size_t i = 30; i < read.size(); ++i) REQUIRE(std::fabs(read[i] / speed - 1) < 1 / (10e6 * 1e-3 - 2));
}

TEST_CASE("tachogenerator: noise and bandwidth", "[engine][sensor]") {
  SpeedSensorData data;
  data.kind = SpeedSensorKind::tachogenerator;
  data.noise_rpm = 3.0;
  data.bandwidth_Hz = 200.0;
  const double unit = 2 * pi / 60, speed = 1000 * unit;
  Bench bench(
      data, [&](double t) { return speed * t; }, speed);
  const Noise noise(21, 0);
  const NoiseChannel channel("speed");
  const int count = 20000;
  double sum = 0.0, squares = 0.0;
  for (int k = 1; k <= count; ++k) {
    const double error = (bench.next(noise.sample(channel, k)) - speed) / unit;
    sum += error;
    squares += error * error;
  }
  CHECK(std::fabs(sum / count) < 4 * 3.0 / std::sqrt(count));                // 4 standard errors, rpm
  CHECK(std::fabs(squares / count / 9.0 - 1) < 4 * std::sqrt(2.0 / count));  // likewise
  // Step of speed at rest: 1 - e^{-w t}; the step lies inside one plant step, so it is known to within h.
  Bench step(
      data, [&](double t) { return speed * t; }, 0.0);
  const double w = 2 * pi * 200.0;
  for (int k = 1; k <= 50; ++k) {
    CHECK(std::fabs(step.next() / speed - (1 - std::exp(-w * 1e-4 * k))) < w * Bench::h);
  }
}

TEST_CASE("speed sensor: none tells nothing, ideal the truth", "[engine][sensor]") {
  SpeedSensorData data;
  Bench none(data, [](double t) { return 5.0 * t; });
  CHECK(std::isnan(none.next()));
  data.kind = SpeedSensorKind::ideal;
  Bench ideal(data, [](double t) { return 5.0 * t; });
  CHECK(ideal.next() == Approx(5.0).epsilon(1e-9));  // (difference of angles) / h on the bench rounds at 1e-16 / 1e-5
}
