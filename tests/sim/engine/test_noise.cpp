// Noise: the generator's published vectors, the normal transform's distribution, and independence of everything that
// should be independent. Seeds are fixed, so each statistical bound (4 standard errors, or 1 % for Kolmogorov-Smirnov)
// holds or fails for good.
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <cstring>
#include <vector>

#include "plant/math/frames.hpp"
#include "sim/engine/noise.hpp"

using namespace slipbench;

namespace {

std::vector<double> draw(const Noise& noise, const char* channel, std::int64_t first, std::size_t count) {
  const NoiseChannel from(channel);
  std::vector<double> x(count);
  for (std::size_t i = 0; i < count; ++i) x[i] = noise.sample(from, first + static_cast<std::int64_t>(i));
  return x;
}

// Correlation of two standard normal sequences (means zero, variances one known); standard error 1/sqrt(n).
double correlation(const std::vector<double>& x, const std::vector<double>& y, std::size_t lag = 0) {
  double sum = 0.0;
  for (std::size_t i = 0; i + lag < x.size(); ++i) sum += x[i] * y[i + lag];
  return sum / static_cast<double>(x.size() - lag);
}

double covariance(const std::vector<double>& x, const std::vector<double>& y) {
  double x_sum = 0.0, y_sum = 0.0, product_sum = 0.0;
  for (std::size_t i = 0; i < x.size(); ++i) {
    x_sum += x[i];
    y_sum += y[i];
    product_sum += x[i] * y[i];
  }
  const auto n = static_cast<double>(x.size());
  return product_sum / n - x_sum / n * (y_sum / n);
}

}  // namespace

TEST_CASE("philox: published vectors", "[engine][published]") {
  // Known-answer vectors of Salmon et al. 2011 (philox4x32-10), as distributed with their library.
  using Block = PhiloxBlock;
  static_assert(philox4x32_10({0, 0, 0, 0}, {0, 0}) == Block{0x6627e8d5, 0xe169c58d, 0xbc57ac4c, 0x9b00dbd8});
  const std::uint32_t ones = 0xffffffff;
  CHECK(philox4x32_10({ones, ones, ones, ones}, {ones, ones}) == Block{0x408f276d, 0x41c83b0e, 0xa20bc7c6, 0x6d5451fd});
  CHECK(philox4x32_10({0x243f6a88, 0x85a308d3, 0x13198a2e, 0x03707344}, {0xa4093822, 0x299f31d0}) ==
        Block{0xd16cfe09, 0x94fdcceb, 0x5001e420, 0x24126ea1});
  // Counters 1, 2, 3 under key 0: computed by a separate program written from the paper.
  CHECK(philox4x32_10({1, 0, 0, 0}, {0, 0}) == Block{0xf8e4cca4, 0x5cb200db, 0xb1a574eb, 0x097eff67});
  CHECK(philox4x32_10({2, 0, 0, 0}, {0, 0}) == Block{0x04faa329, 0x51c732a6, 0x241513ad, 0x459135e4});
  CHECK(philox4x32_10({3, 0, 0, 0}, {0, 0}) == Block{0xc990ef29, 0x6a4474a6, 0x9ac9134f, 0x6d413e04});
}

TEST_CASE("noise channels: names hash by FNV-1a, none collides, strangers are refused", "[engine][published]") {
  // Test vectors of FNV-1a 32 as its authors publish them.
  CHECK(hash_name("") == 0x811c9dc5u);
  CHECK(hash_name("a") == 0xe40c292cu);
  CHECK(hash_name("foobar") == 0xbf9cf968u);
  CHECK(distinct_hashes(noise_channels));
  // A collision found by search: the check can fail.
  CHECK(hash_name("glbvs") == hash_name("yacxa"));
  CHECK_FALSE(distinct_hashes(std::array<std::string_view, 3>{"glbvs", "speed", "yacxa"}));
  CHECK_THROWS_AS(NoiseChannel("glbvs"), std::invalid_argument);
}

TEST_CASE("noise: counter and key are laid out as stated", "[engine][noise]") {
  const Noise noise(0x0123456789abcdefu, 7);
  const NoiseChannel speed("speed");
  const std::int64_t tick = 0x1122334455667788;
  CHECK(noise.words(speed, tick) ==
        philox4x32_10({0x55667788u, 0x11223344u, hash_name("speed"), 7u}, {0x89abcdefu, 0x01234567u}));
  CHECK(noise.words(speed, -1) ==
        philox4x32_10({0xffffffffu, 0xffffffffu, hash_name("speed"), 7u}, {0x89abcdefu, 0x01234567u}));
}

TEST_CASE("normal transform: agrees with 40-digit arithmetic on the published vectors", "[engine][published]") {
  // sqrt(-2 log u1) cos(2 pi u2) in 40 digits. Bound: 4 ulp of a radius below 2, made up of log 2 (halved by
  // the root), root 1/2, cosine 2 and product 1/2.
  const auto normal = [](const PhiloxBlock& w) {
    return normals_from_uniforms(uniform_from_words(w[0], w[1]), uniform_from_words(w[2], w[3])).even;
  };
  const double bound = 4 * 2.3e-16;
  CHECK(std::fabs(normal({0x6627e8d5, 0xe169c58d, 0xbc57ac4c, 0x9b00dbd8}) - -0.12151797595308087116) < bound);
  CHECK(std::fabs(normal({0x408f276d, 0x41c83b0e, 0xa20bc7c6, 0x6d5451fd}) - -1.1133151005615076327) < bound);
  CHECK(std::fabs(normal({0xd16cfe09, 0x94fdcceb, 0x5001e420, 0x24126ea1}) - -0.24262491967130789319) < bound);
}

TEST_CASE("noise: even and odd ticks share a block, a stream gives the same samples in any order", "[engine][noise]") {
  const Noise noise(11, 3);
  const NoiseChannel speed("speed");
  NoiseStream stream(speed);
  for (const std::int64_t tick : {0, 1, 2, 3, 5, 4, -1, -2, 7, 6, 1000001, 0}) {
    const PhiloxBlock w = noise.words(speed, tick >= 0 ? tick / 2 : (tick - 1) / 2);
    const auto both = normals_from_uniforms(uniform_from_words(w[0], w[1]), uniform_from_words(w[2], w[3]));
    CHECK(noise.sample(speed, tick) == (tick % 2 == 0 ? both.even : both.odd));
    CHECK(stream.at(noise, tick) == noise.sample(speed, tick));
  }
  // On one circle: even^2 + odd^2 = -2 log u1; 8 ulp for two squares, root, log and the trigonometric pair.
  const PhiloxBlock w = noise.words(speed, 21);
  const double radius2 = -2.0 * std::log(uniform_from_words(w[0], w[1]));
  const double even = noise.sample(speed, 42), odd = noise.sample(speed, 43);
  CHECK(std::fabs((even * even + odd * odd) / radius2 - 1.0) < 8 * 2.3e-16);
}

TEST_CASE("normal transform: finite at both ends of its uniforms", "[engine][noise]") {
  CHECK(uniform_from_words(0, 0) == 0x1p-53);
  CHECK(uniform_from_words(0xffffffff, 0xffffffff) == 1.0);
  CHECK(normals_from_uniforms(1.0, 0x1p-53).even == 0.0);
  // sqrt(106 log 2) in 40 digits; 4 ulp of 8.57.
  CHECK(std::fabs(normals_from_uniforms(0x1p-53, 1.0).even - 8.5716743486529049775) < 4 * 1.8e-15);
}

TEST_CASE("normal transform: moments over 1e6 samples", "[engine][noise]") {
  const std::size_t count = 1000000;
  const auto n = static_cast<double>(count);
  double m1 = 0.0, m2 = 0.0, m3 = 0.0, m4 = 0.0;
  for (const double x : draw(Noise(1, 0), "current_a", 0, count)) {
    m1 += x;
    m2 += x * x;
    m3 += x * x * x;
    m4 += x * x * x * x;
  }
  const double mean = m1 / n, variance = m2 / n - mean * mean;
  const double third = m3 / n - 3 * mean * m2 / n + 2 * mean * mean * mean;
  const double fourth = m4 / n - 4 * mean * m3 / n + 6 * mean * mean * m2 / n - 3 * mean * mean * mean * mean;
  // Standard errors for a normal population: 1, sqrt 2, sqrt 6, sqrt 24 over sqrt n.
  INFO("mean " << mean << ", variance " << variance);
  CHECK(std::fabs(mean) < 4 / std::sqrt(n));
  CHECK(std::fabs(variance - 1) < 4 * std::sqrt(2 / n));
  CHECK(std::fabs(third / std::pow(variance, 1.5)) < 4 * std::sqrt(6 / n));
  CHECK(std::fabs(fourth / (variance * variance) - 3) < 4 * std::sqrt(24 / n));
}

TEST_CASE("normal transform: Kolmogorov-Smirnov and tails over 1e6 samples", "[engine][noise]") {
  const std::size_t count = 1000000;
  const auto n = static_cast<double>(count);
  std::vector<double> x = draw(Noise(2, 5), "dc_link", 1000, count);
  std::sort(x.begin(), x.end());
  double distance = 0.0;
  for (std::size_t i = 0; i < count; ++i) {
    const double expected = 0.5 * std::erfc(-x[i] / std::sqrt(2.0));
    const auto below = static_cast<double>(i);
    distance = std::max({distance, (below + 1) / n - expected, expected - below / n});
  }
  INFO("D sqrt n = " << distance * std::sqrt(n));
  CHECK(distance < 1.63 / std::sqrt(n));  // 1 % point of Kolmogorov's distribution
  CHECK(distance > 0.1 / std::sqrt(n));   // closer than chance allows would be as wrong
  for (const double limit : {3.0, 4.0}) {
    const double expected = n * std::erfc(limit / std::sqrt(2.0));  // 2699.8 and 63.3
    const auto beyond =
        static_cast<double>(std::count_if(x.begin(), x.end(), [&](double v) { return std::fabs(v) > limit; }));
    INFO(beyond << " beyond " << limit << " sigma, expected " << expected);
    CHECK(std::fabs(beyond - expected) < 4 * std::sqrt(expected));  // Poisson
  }
}

TEST_CASE("noise: neighbours, channels, runs and seeds are uncorrelated", "[engine][noise]") {
  const std::size_t count = 100000;
  const double bound = 4 / std::sqrt(static_cast<double>(count));
  const std::vector<double> base = draw(Noise(3, 0), "current_a", 0, count);
  for (const std::size_t lag : {1u, 2u, 3u, 16u, 256u}) CHECK(std::fabs(correlation(base, base, lag)) < bound);
  CHECK(std::fabs(correlation(base, draw(Noise(3, 0), "current_b", 0, count))) < bound);
  CHECK(std::fabs(correlation(base, draw(Noise(3, 0), "speed", 0, count))) < bound);
  CHECK(std::fabs(correlation(base, draw(Noise(3, 1), "current_a", 0, count))) < bound);
  CHECK(std::fabs(correlation(base, draw(Noise(4, 0), "current_a", 0, count))) < bound);
  CHECK(std::fabs(correlation(base, draw(Noise(3 + (1ull << 32), 0), "current_a", 0, count))) < bound);
  CHECK(std::fabs(correlation(base, draw(Noise(3, 0), "current_a", std::int64_t{1} << 32, count))) < bound);
}

TEST_CASE("noise: a sample depends on nothing but seed, run, name and tick", "[engine][noise]") {
  const Noise noise(9, 2);
  const std::vector<double> forward = draw(noise, "current_c", 0, 1000);
  // Other channels drawn in between, backwards, from another object: the same bits.
  const Noise again(9, 2);
  const NoiseChannel channel("current_c");
  bool same = true;
  for (std::size_t i = 1000; i-- > 0;) {
    for (const std::string_view other : noise_channels) {
      (void)again.sample(NoiseChannel(other), static_cast<std::int64_t>(i));
    }
    const double x = again.sample(channel, static_cast<std::int64_t>(i));
    same = same && std::memcmp(&x, &forward[i], sizeof x) == 0;
  }
  CHECK(same);
}

TEST_CASE("current noise in alpha-beta: three sensors give 2/3 s^2 I, two give correlated noise", "[engine][noise]") {
  // Closed form: with c = -a - b, alpha = a and beta = (a + 2 b) / sqrt 3, so var 1, 5/3 and covariance 1 / sqrt 3
  // times s^2. Standard error of a covariance: sqrt((v1 v2 + cov^2) / n).
  const std::size_t count = 200000;
  const auto n = static_cast<double>(count);
  const Noise noise(5, 0);
  const std::vector<double> a = draw(noise, "current_a", 0, count), b = draw(noise, "current_b", 0, count),
                            c = draw(noise, "current_c", 0, count);
  const auto check = [&](auto transform, double v_alpha, double cov, double v_beta) {
    std::vector<double> alpha(count), beta(count);
    for (std::size_t i = 0; i < count; ++i) {
      const Vec2<double> x = transform(i);
      alpha[i] = x.x;
      beta[i] = x.y;
    }
    CHECK(std::fabs(covariance(alpha, alpha) - v_alpha) < 4 * v_alpha * std::sqrt(2 / n));
    CHECK(std::fabs(covariance(beta, beta) - v_beta) < 4 * v_beta * std::sqrt(2 / n));
    CHECK(std::fabs(covariance(alpha, beta) - cov) < 4 * std::sqrt((v_alpha * v_beta + cov * cov) / n));
  };
  check([&](std::size_t i) { return clarke(Phases<double>{a[i], b[i], c[i]}); }, 2.0 / 3.0, 0.0, 2.0 / 3.0);
  check([&](std::size_t i) { return clarke_two(a[i], b[i]); }, 1.0, 1.0 / std::sqrt(3.0), 5.0 / 3.0);
}
