// Analog channel: its filter against the closed form of a first-order low-pass, its converter against the definition.
#include <catch2/catch.hpp>
#include <cmath>
#include <complex>
#include <limits>

#include "sim/engine/analog_sensor.hpp"
#include "sim/engine/noise.hpp"

using namespace slipbench;

namespace {

constexpr double pi = 3.14159265358979323846;

// Steady gain and phase of the filter at f, by projection on one period's sine and cosine after 30 time constants.
std::complex<double> response(double corner_Hz, double f, double h) {
  const AnalogSensor<double> sensor = prepare_analog_sensor({.bandwidth_Hz = corner_Hz}, h);
  const auto per_period = static_cast<int>(std::lround(1 / (f * h)));
  const int settle = per_period * (1 + static_cast<int>(30 / (2 * pi * corner_Hz) * f));
  const double turn = 2 * pi / per_period;
  AnalogState<double> state = begin_analog(0.0);
  std::complex<double> sum;
  for (int n = 1; n <= settle + per_period; ++n) {
    filter_step(state, std::cos(turn * n), sensor);
    if (n > settle) sum += state.filtered * std::polar(2.0 / per_period, -turn * n);
  }
  return sum;
}

}  // namespace

TEST_CASE("analog filter: frequency response equals the first-order low-pass", "[engine][sensor]") {
  // H = 1 / (1 + j f / f0). A sine drawn in straight lines has the amplitude sinc^2(f h) = 1 - (w h)^2 / 12, no phase
  // of its own, and images at f + k / h, of amplitude (f h / (f h + k))^2; those the filter leaves fold back onto f.
  // With H(k / h) = -j f0 h / k - (f0 h / k)^2 they sum to 6 zeta(4) (f h)^3 f0 h and 2 zeta(4) (f h f0 h)^2, zeta(4)
  // = 1.082.
  const double corner = 1000.0;
  for (const double h : {10e-6, 20e-6}) {
    for (const double f : {10.0, 100.0, 500.0, 1000.0, 2500.0, 5000.0}) {
      const std::complex<double> ideal = 1.0 / std::complex<double>(1.0, f / corner);
      const std::complex<double> found = response(corner, f, h);
      const double x = f * h, y = corner * h;
      const double images = (6.5 * x * x * x * y + 2.17 * x * x * y * y) * std::sqrt(1 + f * f / corner / corner);
      const double amplitude = 1 - std::pow(2 * pi * x, 2) / 12, next_term = std::pow(2 * pi * x, 4) / 360;
      INFO("f = " << f << ", h = " << h);
      // Rounding of the projection: 1e-11.
      CHECK(std::fabs(std::abs(found) / std::abs(ideal) - amplitude) < images + next_term + 1e-11);
      CHECK(std::fabs(std::arg(found / ideal)) < images + 1e-11);
    }
  }
}

TEST_CASE("analog filter: exact for a step's decay and for a ramp", "[engine][sensor]") {
  const double h = 10e-6, corner = 2000.0, w = 2 * pi * corner;
  const AnalogSensor<double> sensor = prepare_analog_sensor({.bandwidth_Hz = corner}, h);
  AnalogState<double> decay{0.0, 1.0};
  AnalogState<double> ramp = begin_analog(0.0);
  for (int n = 1; n <= 200; ++n) {
    const double t = n * h;
    filter_step(decay, 0.0, sensor);
    filter_step(ramp, 3.0 * t, sensor);
    // Rounding: 200 steps of one ulp of the largest term.
    CHECK(std::fabs(decay.filtered - std::exp(-w * t)) < 1e-13);
    CHECK(std::fabs(ramp.filtered - 3.0 * (t - (1 - std::exp(-w * t)) / w)) < 1e-15);
  }
}

TEST_CASE("analog filter: a constant stays to the bit, no bandwidth passes the input", "[engine][sensor]") {
  const AnalogSensor<double> slow = prepare_analog_sensor({.bandwidth_Hz = 777.0}, 10e-6);
  const AnalogSensor<double> none = prepare_analog_sensor({}, 10e-6);
  AnalogState<double> held = begin_analog(0.1), passed = begin_analog(0.0);
  for (int n = 0; n < 1000; ++n) {
    filter_step(held, 0.1, slow);
    REQUIRE(held.filtered == 0.1);
    filter_step(passed, 0.37 * n, none);
    REQUIRE(passed.filtered == 0.37 * n);
  }
  // A bandwidth far above the step rate is no filter either: what is left is 1/a of the last move, a = 6e4.
  const AnalogSensor<double> fast = prepare_analog_sensor({.bandwidth_Hz = 1e9}, 10e-6);
  AnalogState<double> state = begin_analog(0.0);
  filter_step(state, 1.0, fast);
  CHECK(std::fabs(state.filtered - 1.0) < 1.6e-5);
}

TEST_CASE("converter: codes, both ends and what counts as clipped", "[engine][sensor]") {
  const AnalogSensor<double> adc = prepare_analog_sensor({.bits = 12, .range = 20.48}, 10e-6);
  const double lsb = 20.48 / 2048;
  const auto read = [&](double x) { return convert(begin_analog(x), 0.0, adc); };
  CHECK(adc.lsb == lsb);
  CHECK(read(0.0).value == 0.0);
  CHECK(read(0.49 * lsb).value == 0.0);
  CHECK(read(0.51 * lsb).value == lsb);
  CHECK(read(-0.49 * lsb).value == 0.0);
  CHECK(read(-0.51 * lsb).value == -lsb);
  for (const auto& [x, value, clipped] :
       {std::array{2047.4, 2047.0, 0.0}, std::array{2047.6, 2047.0, 1.0}, std::array{2048.0, 2047.0, 1.0},
        std::array{1e6, 2047.0, 1.0}, std::array{-2048.4, -2048.0, 0.0}, std::array{-2048.6, -2048.0, 1.0},
        std::array{-1e6, -2048.0, 1.0}}) {
    INFO("x = " << x << " lsb");
    CHECK(read(x * lsb).value == value * lsb);
    CHECK(read(x * lsb).clipped == clipped);
  }
}

TEST_CASE("converter: what is not finite is not hidden by the range", "[engine][sensor]") {
  const double infinity = std::numeric_limits<double>::infinity();
  for (const std::int64_t bits : {0, 12}) {
    const AnalogSensor<double> adc = prepare_analog_sensor({.bits = bits, .range = 10.0}, 10e-6);
    CHECK(convert(begin_analog(infinity), 0.0, adc).value == infinity);
    CHECK(convert(begin_analog(-infinity), 0.0, adc).value == -infinity);
    CHECK(std::isnan(convert(begin_analog(std::nan("")), 0.0, adc).value));
  }
}

TEST_CASE("converter: the error is uniform over one lsb, rms lsb / sqrt 12", "[engine][sensor]") {
  const AnalogSensor<double> adc = prepare_analog_sensor({.bits = 10, .range = 10.0}, 10e-6);
  const Noise noise(11, 0);
  const NoiseChannel channel("current_a");
  const int count = 200000, bins = 20;
  std::array<int, bins> found{};
  double squares = 0.0, sum = 0.0;
  for (int i = 0; i < count; ++i) {
    const PhiloxBlock w = noise.words(channel, i);
    const double x = 18.0 * (uniform_from_words(w[0], w[1]) - 0.5);  // +-9, within the range
    const double error = (convert(begin_analog(x), 0.0, adc).value - x) / adc.lsb;
    REQUIRE(std::fabs(error) <= 0.5 + 1e-9);  // rounding of x / lsb at 2^9 codes
    ++found[static_cast<std::size_t>(std::min(bins - 1, std::max(0, static_cast<int>((error + 0.5) * bins))))];
    squares += error * error;
    sum += error;
  }
  // Standard errors of mean and mean square of a uniform variable: 1/sqrt(12 n), 1/sqrt(180 n); 4 of them.
  CHECK(std::fabs(sum / count) < 4 / std::sqrt(12.0 * count));
  CHECK(std::fabs(squares / count - 1.0 / 12) < 4 / std::sqrt(180.0 * count));
  double chi2 = 0.0;
  for (const int k : found) chi2 += std::pow(k - count / bins, 2) / (count / bins);
  CHECK(chi2 < 43.8);  // 0.1 % point of chi-squared, 19 degrees of freedom
}

TEST_CASE("analog channel: gain error, offset and noise act as stated", "[engine][sensor]") {
  const AnalogChannel channel{.noise_rms = 0.2, .gain_error = 0.01, .offset = -0.3};
  const AnalogSensor<double> sensor = prepare_analog_sensor(channel, 10e-6);
  // Plain arithmetic in the same order: to an ulp.
  CHECK(convert(begin_analog(5.0), 0.0, sensor).value == Approx(5.0 * 1.01 - 0.3).epsilon(1e-15));
  CHECK(convert(begin_analog(5.0), 2.0, sensor).value == Approx(5.0 * 1.01 - 0.3 + 0.4).epsilon(1e-15));
  CHECK(convert(begin_analog(1e12), 0.0, sensor).clipped == 0.0);  // no converter, no end
}

TEST_CASE("analog channel: total noise is the converter's and the amplifier's together", "[engine][sensor]") {
  // Noise of about one lsb whitens the rounding, so variances add (B. Widrow, I. Kollar, "Quantization Noise", 2008):
  // what is left of the correlation is e^{-2 pi^2 sigma^2 / lsb^2}, 1e-13 here.
  const AnalogChannel channel{.noise_rms = 0.03, .bits = 10, .range = 12.8};
  const AnalogSensor<double> sensor = prepare_analog_sensor(channel, 10e-6);
  CHECK(total_noise_rms(channel) == Approx(std::sqrt(0.03 * 0.03 + 0.025 * 0.025 / 12)).epsilon(1e-15));
  CHECK(total_noise_rms({.noise_rms = 0.03}) == Approx(0.03).epsilon(1e-15));
  const Noise noise(12, 0);
  const NoiseChannel name("current_b");
  const int count = 200000;
  double squares = 0.0;
  for (int i = 0; i < count; ++i) {
    const double error = convert(begin_analog(1.2345), noise.sample(name, i), sensor).value - 1.2345;
    squares += error * error;
  }
  const double variance = total_noise_rms(channel) * total_noise_rms(channel);
  CHECK(std::fabs(squares / count / variance - 1) < 4 * std::sqrt(2.0 / count));  // 4 standard errors
}

TEST_CASE("analog channel: float runs the same source", "[engine][sensor]") {
  const AnalogSensor<double> wide = prepare_analog_sensor({.bandwidth_Hz = 1000.0, .bits = 12, .range = 10.0}, 10e-6);
  const auto narrow = in_number<AnalogSensor<float>, float>(wide);
  AnalogState<double> a = begin_analog(0.0);
  AnalogState<float> b = begin_analog(0.0f);
  for (int n = 1; n <= 1000; ++n) {
    const double x = 8.0 * std::sin(0.01 * n);
    filter_step(a, x, wide);
    filter_step(b, static_cast<float>(x), narrow);
    // Errors of a stable filter do not pile up: some ulp of 8 (5e-7) over the share renewed a step (0.06); one code
    // apart.
    REQUIRE(std::fabs(a.filtered - static_cast<double>(b.filtered)) < 2e-5);
    REQUIRE(std::fabs(convert(a, 0.0, wide).value - static_cast<double>(convert(b, 0.0f, narrow).value)) <
            1.01 * wide.lsb);
  }
}
