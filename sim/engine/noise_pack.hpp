// Noise for each lane, the very samples that each gets alone. Lanes of one seed and run share one sample, reckoned once.
#pragma once

#include <array>

#include "sim/engine/noise.hpp"
#include "sim/engine/setup.hpp"

namespace slipbench {

template <class Real>
class NoisePack {
 public:
  explicit NoisePack(Cases cases) {
    for (std::size_t lane = 0; lane < width; ++lane) {
      noise_[lane] = Noise(cases[lane]->seed, cases[lane]->noise_run);
      shared_ = shared_ && cases[lane]->seed == cases[0]->seed && cases[lane]->noise_run == cases[0]->noise_run;
    }
  }

  [[nodiscard]] NormalPair<Real> pair(NoiseChannel channel, std::int64_t block) const {
    if (shared_) {
      const NormalPair<double> same = noise_[0].pair(channel, block);
      return {Real(same.even), Real(same.odd)};
    }
    Real u1{}, u2{};
    for (std::size_t lane = 0; lane < width; ++lane) {
      const PhiloxBlock w = noise_[lane].words(channel, block);
      set_lane(u1, lane, uniform_from_words(w[0], w[1]));
      set_lane(u2, lane, uniform_from_words(w[2], w[3]));
    }
    return normals_from_uniforms(u1, u2);
  }

 private:
  static constexpr std::size_t width = width_of<Real>;
  std::array<Noise, width> noise_;
  bool shared_ = true;
};

}  // namespace slipbench
