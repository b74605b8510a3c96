// Rotor-flux-oriented control with indirect or direct orientation: speed (or torque) and flux to leg duties.
//
//   orientation.hpp     where the flux lies at tick k, currents seen from there
//   field_weakening.hpp flux reference, d current, limit of the q current; magnetising before speed
//   speed_control.hpp   torque reference, limited
//   i_q = T / (3/2 p (L_m/L_r) psi)
//   current_control.hpp voltage, limit, delay, dead time, duties
//
// Every choice (orientation, modulation, speed or torque, delay) is a number among the constants and taken by
// `select`, so that lanes may differ in it and exported code folds it away. SI units; amplitude-invariant; d on the
// rotor flux.
// Source: W. Leonhard, "Control of Electrical Drives", 3rd ed., 2001, ch. 12 (from memory); parts as their headers say.
#pragma once

#include "controllers/current_control.hpp"
#include "controllers/field_weakening.hpp"
#include "controllers/orientation.hpp"
#include "controllers/speed_control.hpp"

namespace slipbench {

// From speed and flux to the current reference, for any current loop; returns the torque reference. `s` and `c` hold the parts
// named orientation, flux and speed. A drive that is already running is taken over as it is found, at its current, torque and
// speed.
template <class Real, class State, class Constants>
Real follow_speed_and_flux(State& s, const Constants& c, const Measurement<Real>& m, const RotorFrame<Real>& frame,
                           const Real& limit, const Real& asked, const MaskOf<Real>& first) {
  section<Real>("first tick: current, speed and torque taken over as they are");
  s.started = Real(1.0);
  s.current_reference = select(first, frame.current, s.current_reference);
  s.speed.reference = select(first, m.speed, s.speed.reference);
  const Real torque_now = c.torque_per_ampere * frame.flux * frame.current.y;
  s.speed.integral = select(first, s.flux.magnetised * torque_now, s.speed.integral);

  const FluxCommand<Real> d = control_flux(s.flux, c.flux, frame, limit, s.current_reference, asked);
  const Real per_ampere = c.torque_per_ampere * frame.divisor_flux;
  const MaskOf<Real> hold = s.flux.magnetised < Real(0.5);
  SLIPBENCH_LABEL(per_ampere, hold)
  const Real torque = control_speed(s.speed, c.speed, m, per_ampere * d.i_q_limit, hold);
  section<Real>("i_q = T / (3/2 p (L_m/L_r) psi)");
  s.current_reference = {d.i_d, torque / per_ampere};
  label("torque_reference", torque);
  label_d_q("i_reference", s.current_reference);
  return torque;
}

struct RotorFluxOriented {
  static constexpr std::string_view kind = "rotor_flux_oriented";
  static constexpr bool takes_speed = true;
  static constexpr std::array<Setting, 7> settings{{
      {"current_bandwidth_Hz", "Hz", 1.0, 5000.0, derived,
       "bandwidth alpha_c / 2 pi of the current loop; default 0.06 / ((d + 1/2) T), at most 500 Hz"},
      {"speed_bandwidth_Hz", "Hz", 0.01, 500.0, derived,
       "crossover of the speed loop; default 1 / (4 T_sum) / 2 pi, T_sum the loop's small lags"},
      {"speed_lag_s", "s", 0.0, 1.0, derived,
       "lag of the speed signal, part of T_sum; default 1 ms from a sensor, 4 ms from an estimator"},
      {"flux_bandwidth_Hz", "Hz", 0.01, 100.0, derived,
       "bandwidth of the flux loop; default 5 / tau_r / 2 pi, at most a twentieth of the current loop's"},
      {"current_limit_peak_A", "A", 0.001, 1e6, derived,
       "limit of the stator current's peak, d first; default twice the rated peak"},
      {"voltage_margin", "", 0.3, 1.0, 0.92,
       "share of the voltage limit that field weakening plans with; the rest is left to the current loop"},
      {"magnetised_share", "", 0.1, 0.99, 0.95, "share of the flux reference that must stand before torque is given"},
  }};

  template <class Real>
  struct Constants {
    OrientationConstants<Real> orientation;
    FluxConstants<Real> flux;
    SpeedConstants<Real> speed;
    CurrentConstants<Real> current;
    Real torque_per_ampere{};  // 3/2 p L_m / L_r: torque per flux and q current
    SLIPBENCH_FIELDS(orientation, flux, speed, current, torque_per_ampere)
  };

  template <class Real>
  struct State {
    OrientationState<Real> orientation;
    FluxState<Real> flux;
    SpeedState<Real> speed;
    CurrentState<Real> current;
    Vec2<Real> current_reference;  // of the tick before, d-q
    Real started{};                // 0 at the first tick
    SLIPBENCH_FIELDS(orientation, flux, speed, current, current_reference, started)
  };

  static constexpr std::string_view state_note =
      "Orientation: _x alpha, _y beta, Wb, A, mechanical rad/s; current_integral V and current_reference A: _x d, _y "
      "q; "
      "current_commanded: V, alpha-beta, of this tick and those before; speed_integral N m.";

  // Throws std::invalid_argument for a delay outside 0..2 periods and for data without which no gain exists.
  static Constants<double> prepare(const ControllerSetup& setup, const Settings& given);
  static State<double> begin(const ControllerSetup& setup, const Constants<double>& c);
  // alpha_c, rad/s.
  static double current_bandwidth(const ControllerSetup& setup, const Settings& given);

  // Flux that a steady drive settles at, with field weakening, at this speed (rad/s) and torque.
  static double steady_rotor_flux(const Constants<double>& c, double dc_link_V, double speed_rad_s, double torque_Nm);

  template <class Real>
  static Command<Real> step(State<Real>& s, const Measurement<Real>& m, const Constants<Real>& c) {
    const MaskOf<Real> first = s.started < Real(0.5);
    SLIPBENCH_LABEL(first)
    const Vec2<Real> applied = applied_before(s.current.commanded, c.current.delay);
    const RotorFrame<Real> frame = orient(s.orientation, c.orientation, m, applied, first);

    section<Real>("first tick: x = R i");
    s.current.integral = select(first, c.current.resistance * frame.current, s.current.integral);
    section<Real>("U: linear limit of the modulation times the DC link, less what dead time takes");
    const Real limit = voltage_limit(c.current, m.dc_link);
    label("voltage_limit", limit);
    const Real torque = follow_speed_and_flux(s, c, m, frame, limit, s.current.asked, first);
    const VoltageCommand<Real> u = control_current(s.current, c.current, frame, s.current_reference, limit, m.dc_link);
    Command<Real> out;
    out.duty = u.duty;
    out.clipped = u.clipped;
    out.rotor_flux_reference = s.flux.reference;
    out.torque_reference = torque;
    out.current_reference = s.current_reference;
    return out;
  }
};

extern template Command<double> RotorFluxOriented::step(State<double>&, const Measurement<double>&,
                                                        const Constants<double>&);
extern template Command<float> RotorFluxOriented::step(State<float>&, const Measurement<float>&,
                                                       const Constants<float>&);

}  // namespace slipbench
