// Stiff symmetrical three-phase mains.
//
//   u_a = U cos(2 pi f t + phase), b and c 120 and 240 degrees behind;  u_alpha + j u_beta = U e^{j (2 pi f t + phase)}
//
// U phase peak (V) = sqrt(2/3) times the rms line voltage. The phase is reckoned in turns, so that long runs lose none of it.
#pragma once

#include "plant/math/elementary.hpp"
#include "plant/math/vec.hpp"

namespace slipbench {

template <class Real>
struct Mains {
  Real peak{};         // V
  Real frequency{};    // Hz
  Real phase_turns{};  // of phase a's cosine
  SLIPBENCH_FIELDS(peak, frequency, phase_turns)
};

inline Mains<double> make_mains(double line_voltage_V, double frequency_Hz, double phase_deg) {
  return {line_voltage_V * 0.81649658092772603273, frequency_Hz, phase_deg / 360.0};
}

template <class Real>
Vec2<Real> mains_voltage(const Mains<Real>& m, double t) {
  const SinCos<Real> angle = sincos_turns(m.frequency * Real(t) + m.phase_turns);
  return {m.peak * angle.cos, m.peak * angle.sin};
}

}  // namespace slipbench
