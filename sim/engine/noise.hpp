// Noise by counter: a sample is a pure function of (seed, run, channel by its name, tick), so that neither
// the order of calls nor another channel can change it.
//
//   w[4]  = philox4x32-10(counter = {block low, block high, channel, run}, key = {seed low, seed high}), block = floor(tick / 2)
//   u     = (floor((w_high 2^32 + w_low) / 2^11) + 1) / 2^53     in (0, 1]: u1 of w[0], w[1]; u2 of w[2], w[3]
//   n     = sqrt(-2 log u1) cos(2 pi u2) at even ticks, sin at odd ones: mean 0, variance 1
//
// |n| <= sqrt(106 log 2) = 8.57, which leaves out a probability of 1e-17. Sources: J.K. Salmon, M.A. Moraes,
// R.O. Dror, D.E. Shaw, "Parallel random numbers: as easy as 1, 2, 3", SC11, 2011; G.E.P. Box, M.E. Muller,
// Ann. Math. Stat. 29(2), 1958, 610-611.
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <limits>
#include <stdexcept>
#include <string_view>

#include "plant/math/elementary.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

using PhiloxBlock = std::array<std::uint32_t, 4>;
using PhiloxKey = std::array<std::uint32_t, 2>;

constexpr PhiloxBlock philox4x32_10(const PhiloxBlock& counter, const PhiloxKey& key) {
  std::uint32_t a = counter[0], b = counter[1], c = counter[2], d = counter[3], k0 = key[0], k1 = key[1];
#pragma GCC unroll 10  // a quarter off the time of a sample
  for (int round = 0; round < 10; ++round) {
    const std::uint64_t first = 0xD2511F53ULL * a, second = 0xCD9E8D57ULL * c;
    a = static_cast<std::uint32_t>(second >> 32) ^ b ^ k0;
    b = static_cast<std::uint32_t>(second);
    c = static_cast<std::uint32_t>(first >> 32) ^ d ^ k1;
    d = static_cast<std::uint32_t>(first);
    k0 += 0x9E3779B9U;
    k1 += 0xBB67AE85U;
  }
  return {a, b, c, d};
}

// FNV-1a, 32 bits (G. Fowler, L.C. Noll, K.-P. Vo, 1991).
constexpr std::uint32_t hash_name(std::string_view name) {
  std::uint32_t hash = 0x811C9DC5U;
  for (const char letter : name) hash = (hash ^ static_cast<std::uint8_t>(letter)) * 0x01000193U;
  return hash;
}

// Every channel there is. A new one is a new line: its samples hang on its name alone, not on its place here.
// clang-format off
inline constexpr std::array<std::string_view, 13> noise_channels = {
    "current_a", "current_b", "current_c", "voltage_a", "voltage_b", "voltage_c", "dc_link", "speed",
    "process_load_torque", "process_current_alpha", "process_current_beta", "process_flux_alpha", "process_flux_beta"};
// clang-format on

template <std::size_t N>
constexpr bool distinct_hashes(const std::array<std::string_view, N>& names) {
  for (std::size_t i = 0; i < N; ++i) {
    for (std::size_t j = i + 1; j < N; ++j) {
      if (hash_name(names[i]) == hash_name(names[j])) return false;
    }
  }
  return true;
}
static_assert(distinct_hashes(noise_channels), "two noise channels would share their samples: rename one");

// A channel of the list above; any other name is refused, since only listed names are known not to collide.
class NoiseChannel {
 public:
  constexpr explicit NoiseChannel(std::string_view name) : id_(hash_name(name)) {
    for (const std::string_view known : noise_channels) {
      if (known == name) return;
    }
    throw std::invalid_argument("noise channel not listed in noise_channels");
  }
  [[nodiscard]] constexpr std::uint32_t id() const { return id_; }

 private:
  std::uint32_t id_;
};

// A uniform number in (0, 1] from two words, exact in double.
constexpr double uniform_from_words(std::uint32_t high, std::uint32_t low) {
  const std::uint64_t bits = (std::uint64_t{high} << 32 | low) >> 11;
  return static_cast<double>(static_cast<std::int64_t>(bits) + 1) * 0x1p-53;
}

// Two standard normals from two uniforms in (0, 1]; the same bits for every number type over double.
template <class Real>
struct NormalPair {
  Real even{}, odd{};
};
template <class Real>
inline NormalPair<Real> normals_from_uniforms(const Real& u1, const Real& u2) {
  const Real length = sqrt(Real(-2.0) * log(u1));
  const SinCos<Real> angle = sincos_turns(u2);
  return {length * angle.cos, length * angle.sin};
}

class Noise {
 public:
  constexpr explicit Noise(std::uint64_t seed = 0, std::uint32_t run = 0)
      : key_{static_cast<std::uint32_t>(seed), static_cast<std::uint32_t>(seed >> 32)}, run_(run) {}

  // The block of ticks 2 block and 2 block + 1.
  [[nodiscard]] constexpr PhiloxBlock words(NoiseChannel channel, std::int64_t block) const {
    const auto count = static_cast<std::uint64_t>(block);
    return philox4x32_10(
        {static_cast<std::uint32_t>(count), static_cast<std::uint32_t>(count >> 32), channel.id(), run_}, key_);
  }
  [[nodiscard]] NormalPair<double> pair(NoiseChannel channel, std::int64_t block) const {
    const PhiloxBlock w = words(channel, block);
    return normals_from_uniforms(uniform_from_words(w[0], w[1]), uniform_from_words(w[2], w[3]));
  }
  // Standard normal.
  [[nodiscard]] double sample(NoiseChannel channel, std::int64_t tick) const {
    const NormalPair<double> both = pair(channel, tick >> 1);
    return (tick & 1) == 0 ? both.even : both.odd;
  }

 private:
  PhiloxKey key_;
  std::uint32_t run_;
};

// One channel read tick by tick, each pair reckoned once: the samples of Noise::sample, or of a pack of them (noise_pack.hpp).
template <class Real = double>
class NoiseStream {
 public:
  explicit NoiseStream(NoiseChannel channel) : channel_(channel) {}
  template <class Source>
  Real at(const Source& noise, std::int64_t tick) {
    if (tick >> 1 != block_) {
      block_ = tick >> 1;
      pair_ = noise.pair(channel_, block_);
    }
    return (tick & 1) == 0 ? pair_.even : pair_.odd;
  }

 private:
  NoiseChannel channel_;
  std::int64_t block_ = std::numeric_limits<std::int64_t>::min();
  NormalPair<Real> pair_;
};

}  // namespace slipbench
