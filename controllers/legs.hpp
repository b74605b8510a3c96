// From a voltage command in a turning frame to the legs' duties: advance over the delay, dead time, modulation.
//
//   The vector stands over [k+d, k+d+1) in the stationary frame: it is turned by angle + w_s (d + 1/2) T. Dead time: the mean
//   leg errors believed at the expected current turned to that same mid angle are added back as a vector, tied legs left out.
//   The expected current should be free of noise where it crosses zero. Voltage limit: circle of the modulation's linear limit
//   times the measured DC link, less 4/3 of the leg error that is to be compensated.
//
// T control period s, d delay in periods, w_s stator frequency rad/s. Source: plant/inverter_averaged.hpp, plant/modulation.hpp.
#pragma once

#include "controllers/control.hpp"
#include "plant/inverter_averaged.hpp"

namespace slipbench {

template <class Real>
struct LegConstants {
  Real advance{};           // (d + 1/2) T s
  Real linear_limit{};      // of the DC link
  Real modulation{};        // 0 space vector, 1 sine, 2 discontinuous
  LegError<Real> believed;  // zero without compensation
  SLIPBENCH_FIELDS(advance, linear_limit, modulation, believed)
};

inline LegConstants<double> legs_of(const ControllerSetup& setup) {
  const InverterBelief& inverter = setup.inverter;
  LegConstants<double> c;
  c.advance = (setup.delay_periods + 0.5) * setup.control_period_s;
  c.linear_limit = linear_limit(setup.modulation);
  c.modulation = setup.modulation == Modulation::space_vector ? 0.0 : setup.modulation == Modulation::sine ? 1.0 : 2.0;
  const double width = inverter.zero_current_width_A > 0.0 ? inverter.zero_current_width_A : 1.0;
  c.believed = setup.compensate_dead_time
                   ? leg_error(inverter.dead_time_s, inverter.switching_frequency_Hz, inverter.device_drop_V, width)
                   : leg_error(0.0, 0.0, 0.0, width);
  return c;
}

template <class Real>
Real voltage_limit(const LegConstants<Real>& c, const Real& dc_link) {
  const Real reserve = Real(4.0 / 3.0) * (c.believed.dead_share * dc_link + c.believed.device_drop);
  return max(c.linear_limit * dc_link - reserve, Real(0.0));
}

template <class Real>
struct LegCommand {
  Phases<Real> duty;
  SinCos<Real> middle;  // angle of the frame in the middle of the period
  Vec2<Real> applied;   // stationary frame, as believed: what the duties really give
  Vec2<Real> by_rails;  // of that what the rails cut
};

// `voltage` and `current` (expected then) in the frame whose angle is `angle` at tick k and turns at `stator_frequency`.
template <class Real>
LegCommand<Real> command_legs(const LegConstants<Real>& c, const SinCos<Real>& angle, const Real& stator_frequency,
                              const Vec2<Real>& frame_voltage, const Vec2<Real>& frame_current, const Real& dc_link) {
  section<Real>("frame in the middle of the period in which the voltage acts: angle + w_s (d + 1/2) T");
  LegCommand<Real> out;
  const SinCos<Real> ahead = sincos(stator_frequency * c.advance);
  out.middle = {angle.sin * ahead.cos + angle.cos * ahead.sin, angle.cos * ahead.cos - angle.sin * ahead.sin};
  label("middle_sin", out.middle.sin);
  label("middle_cos", out.middle.cos);
  section<Real>("duties: leg errors believed at the expected current added back, then modulation");
  const Vec2<Real> voltage = turn_forward(out.middle, frame_voltage);
  const Phases<Real> current = phases_of(turn_forward(out.middle, frame_current));
  const auto leg_error_at = [&](const Phases<Real>& duty) {
    return clarke(leg_errors(c.believed, current, duty, dc_link));
  };
  label_alpha_beta("voltage", voltage);
  label_phases("i", current);
  const Vec2<Real> raised = voltage - leg_error_at(modulate(c.modulation, voltage, dc_link));
  out.duty = modulate(c.modulation, raised, dc_link);
  label_alpha_beta("raised", raised);
  label_phases("duty", out.duty);
  section<Real>("what these duties really give, as believed");
  out.applied = applied_voltage(out.duty, dc_link) + leg_error_at(out.duty);
  out.by_rails = applied_voltage(out.duty, dc_link) - raised;
  label_alpha_beta("applied", out.applied);
  label_alpha_beta("by_rails", out.by_rails);
  return out;
}

// 1 where circle or rails cut more than rounding leaves, in single precision too, else 0. (The applied voltage misses more: with
// a tied leg that changes, the compensation is off by that leg's dead time.)
template <class Real>
Real clipped_by(const Vec2<Real>& by_circle, const Vec2<Real>& by_rails, const Real& limit) {
  section<Real>("clipped: circle or rails cut more than rounding leaves");
  const Real cut = max(dot(by_circle, by_circle), dot(by_rails, by_rails));
  return select(cut > square(Real(1e-4) * limit), Real(1.0), Real(0.0));
}

}  // namespace slipbench
