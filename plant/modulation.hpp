// From a voltage command to leg duties of a two-level inverter: space-vector, sine and discontinuous modulation, one
// common-mode choice each.
//
//   leg reference v_x = u_x + u_0,  duty d_x = 1/2 + v_x / V_dc
//   sine           u_0 = 0
//   space_vector   u_0 = -(max u + min u) / 2                 (symmetrical, equal zero-vector shares)
//   discontinuous  the leg with the largest |u_x| is tied to its rail (30 degrees either side of its peak)
//
// Linear limit of the phase peak: V_dc / 2 for sine, V_dc / sqrt 3 for the others. A command beyond it is not refused:
// each duty is clamped to [0, 1] (the overmodulation clamp), so the applied mean falls short and bends towards the
// hexagon; `applied_voltage` gives what is left.
// Source: D.G. Holmes, T.A. Lipo, "Pulse Width Modulation for Power Converters", 2003.
#pragma once

#include "plant/math/frames.hpp"

namespace slipbench {

enum class Modulation { space_vector, sine, discontinuous };

// Largest phase peak that the modulation reaches linearly, as a share of V_dc.
constexpr double linear_limit(Modulation kind) { return kind == Modulation::sine ? 0.5 : 0.57735026918962576451; }

// What fixes the common mode: a leg whose reference is `voltage` gets the duty `duty`. Written so that a tied leg's duty
// is 0 or 1 to the last bit: it has no dead time.
template <class Real>
struct CommonMode {
  Real duty, voltage;
};

template <class Real>
CommonMode<Real> space_vector_mode(const Phases<Real>& u) {
  return {Real(0.5), Real(0.5) * (max(max(u.a, u.b), u.c) + min(min(u.a, u.b), u.c))};
}
template <class Real>
CommonMode<Real> sine_mode() {
  return {Real(0.5), Real(0.0)};
}
template <class Real>
CommonMode<Real> discontinuous_mode(const Phases<Real>& u) {
  const Real top = max(max(u.a, u.b), u.c), bottom = min(min(u.a, u.b), u.c);
  const MaskOf<Real> low = top + bottom < Real(0.0);
  return {select(low, Real(0.0), Real(1.0)), select(low, bottom, top)};
}

template <class Real>
Phases<Real> leg_duties(const Phases<Real>& u, const CommonMode<Real>& mode, const Real& dc_link) {
  const Real per_volt = Real(1.0) / max(dc_link, Real(1e-3));
  const auto duty = [&](const Real& x) {
    return clamp(mode.duty + (x - mode.voltage) * per_volt, Real(0.0), Real(1.0));
  };
  return {duty(u.a), duty(u.b), duty(u.c)};
}

template <class Real>
Phases<Real> modulate(Modulation kind, const Vec2<Real>& voltage, const Real& dc_link) {
  const Phases<Real> u = phases_of(voltage);
  if (kind == Modulation::discontinuous) return leg_duties(u, discontinuous_mode(u), dc_link);
  return leg_duties(u, kind == Modulation::sine ? sine_mode<Real>() : space_vector_mode(u), dc_link);
}

// The same with the choice as a number (0 space vector, 1 sine, 2 discontinuous), for steps that keep it among their
// constants.
template <class Real>
Phases<Real> modulate(const Real& kind, const Vec2<Real>& voltage, const Real& dc_link) {
  const Phases<Real> u = phases_of(voltage);
  const CommonMode<Real> sv = space_vector_mode(u), sine = sine_mode<Real>(), tied = discontinuous_mode(u);
  const MaskOf<Real> is_sv = kind < Real(0.5), is_sine = kind < Real(1.5);
  const CommonMode<Real> mode{select(is_sv, sv.duty, select(is_sine, sine.duty, tied.duty)),
                              select(is_sv, sv.voltage, select(is_sine, sine.voltage, tied.voltage))};
  return leg_duties(u, mode, dc_link);
}

// Mean stator voltage (star point floating) that duties give, without dead time or drops.
template <class Real>
Vec2<Real> applied_voltage(const Phases<Real>& duty, const Real& dc_link) {
  return dc_link * clarke(duty);
}

}  // namespace slipbench
