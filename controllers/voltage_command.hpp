// What a current loop does with the voltage it wants: limit, duties, and the memory of what was given.
//
// Limit: the d axis goes first (it holds flux and frame), with at most 0.9 of the circle, so that q always keeps 0.43 of it
// against the back-EMF. Delay and dead time as in legs.hpp, at the reference current: it is free of noise. `missing` is
// what the duties really give less what was wanted, for back-calculation.
//
// Voltages V peak; wanted, given, missing in the rotating frame, commanded in the stationary one.
#pragma once

#include "controllers/legs.hpp"
#include "controllers/orientation.hpp"

namespace slipbench {

template <class Real>
using CommandedVoltages = std::array<Vec2<Real>, 3>;  // of this tick's command and the two before, stationary frame

// Mean stator voltage over the period that ends at this tick: the command of d + 1 ticks ago.
template <class Real>
Vec2<Real> applied_before(const CommandedVoltages<Real>& commanded, const Real& delay) {
  return select(delay < Real(0.5), commanded[0], select(delay < Real(1.5), commanded[1], commanded[2]));
}

template <class Real>
struct VoltageCommand {
  Phases<Real> duty;
  Real clipped{};
  Vec2<Real> given, missing;
};

template <class Real>
VoltageCommand<Real> command_voltage(CommandedVoltages<Real>& commanded, const LegConstants<Real>& c,
                                     const RotorFrame<Real>& f, const Vec2<Real>& wanted, const Vec2<Real>& reference,
                                     const Real& limit, const Real& dc_link) {
  section<Real>("voltage limit: d first, up to 0.9 of the circle, q takes the rest");
  const Real most_d = Real(0.9) * limit, u_d = clamp(wanted.x, -most_d, most_d);
  const Real most_q = sqrt(max(square(limit) - square(u_d), Real(0.0)));
  const Vec2<Real> limited{u_d, clamp(wanted.y, -most_q, most_q)};
  SLIPBENCH_LABEL(most_d, most_q)
  label_d_q("u", limited);

  const LegCommand<Real> legs = command_legs(c, f.angle, f.stator_frequency, limited, reference, dc_link);
  commanded = {legs.applied, commanded[0], commanded[1]};
  section<Real>("what they give seen from the frame, and what is missing of the voltage wanted");
  const Vec2<Real> given = turn_back(legs.middle, legs.applied), missing = given - wanted;
  label_d_q("given", given);
  label_d_q("missing", missing);
  return {legs.duty, clipped_by(limited - wanted, legs.by_rails, limit), given, missing};
}

}  // namespace slipbench
