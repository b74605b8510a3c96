// Rotor-flux orientation with a current loop by state feedback: LQR with reference gain, integral action and an observer at choice.
//
//   speed, flux, field weakening, orientation   as rotor_flux_oriented.hpp, same settings
//   state_current_control.hpp                   u = N i_ref - K x + z, gains scheduled over speed
//   plant/current_flux_observer.hpp             with `observer`: current and flux (and so the frame, unless direct) are the observer's;
//                                               the integral hears the measured current, lest a wrong model leave an error
//
// Gains: from a gain file, or designed in `prepare` by state_feedback_design.hpp; both come as the same settings. Without observer
// the state is the measured current and the flux of the orientation. SI units; amplitude-invariant; d on the rotor flux.
// Source: parts as their headers say.
#pragma once

#include "controllers/rotor_flux_oriented.hpp"
#include "controllers/state_current_control.hpp"
#include "plant/current_flux_observer.hpp"

namespace slipbench {

struct StateFeedback {
  static constexpr std::string_view kind = "state_feedback";
  static constexpr bool takes_speed = true;
  static constexpr std::array<Setting, 13> own_settings{{
      {"integral_action", "", 0.0, 1.0, 1.0, "true: the current error is integrated, so that none stays", true},
      {"observer", "", 0.0, 1.0, 0.0,
       "true: current and flux are a linear observer's instead of measured and modelled ones", true},
      {"integral_bandwidth_Hz", "Hz", 0.1, 2000.0, derived,
       "bandwidth w_I / 2 pi of the integral action in a design; default a fifth of the current loop's"},
      {"measured_current_noise_A", "A", 1e-9, 1e6, derived,
       "noise of a current sensor, rms a phase, that the observer is designed for; default the sensor's, at least 0.1 "
       "% of rated "
       "peak"},
      {"process_voltage_V", "V", 0.0, 1e6, derived,
       "voltage error, rms and fresh each period, that it is designed for; default 0.5 % of rated phase peak"},
      {"process_flux_Wb", "Wb", 0.0, 1e3, derived,
       "rms added to each rotor flux component a period; default a walk of 2 % of the flux reference over 1 s"},
      {"faster_than_controller", "", 0.0, 20.0, 0.0,
       "observer poles so many times faster than current loop and rotor; 0: stationary Kalman gain"},
      {"gain_period_s", "s", 1e-9, 1.0, derived,
       "control period that given gains belong to; another one is refused; default not checked"},
      {"gain_frequency_Hz", "Hz", 0.0, 1e5, derived,
       "electrical speeds p n / 60 that given gains belong to, rising from 0, 7 at most", false, SettingShape::list},
      {"K", "", -1e9, 1e9, derived,
       "u = -K x at each of them: 2 x (4 + 2 delay), over i_d, i_q (V/A), psi_r d, q (V/Wb), voltages on their way (1)",
       false, SettingShape::matrices},
      {"K_integral", "", -1e9, 1e9, derived,
       "voltage a control period and ampere of current error, 2 x 2 at each (V/A)", false, SettingShape::matrices},
      {"reference_gain", "", -1e9, 1e9, derived, "N of u = N i_ref - K x, 2 x 2 at each (V/A)", false,
       SettingShape::matrices},
      {"L", "", -1e9, 1e9, derived,
       "observer: rows i (1) and psi_r (H) by the current's error, 4 x 2 at each, rotating (a, -b; b, a)", false,
       SettingShape::matrices},
  }};
  static constexpr auto settings = [] {
    std::array<Setting, RotorFluxOriented::settings.size() + own_settings.size()> all{};
    std::size_t n = 0;
    for (const Setting& s : RotorFluxOriented::settings) all[n++] = s;
    for (const Setting& s : own_settings) all[n++] = s;
    return all;
  }();

  template <class Real>
  struct Constants {
    OrientationConstants<Real> orientation;
    FluxConstants<Real> flux;
    SpeedConstants<Real> speed;
    StateCurrentConstants<Real> current;
    ObserverConstants<Real> observer;
    Real torque_per_ampere{};  // 3/2 p L_m / L_r
    Real observed{};           // 1: state and frame are the observer's
    SLIPBENCH_FIELDS(orientation, flux, speed, current, observer, torque_per_ampere, observed)
  };

  template <class Real>
  struct State {
    OrientationState<Real> orientation;
    FluxState<Real> flux;
    SpeedState<Real> speed;
    StateCurrentState<Real> current;
    ObserverState<Real> observer;
    Vec2<Real> current_reference;  // of the tick before, d-q
    Real started{};                // 0 at the first tick
    SLIPBENCH_FIELDS(orientation, flux, speed, current, observer, current_reference, started)
  };

  static constexpr std::string_view state_note =
      "Orientation and observer: _x alpha, _y beta, Wb, A (orientation_speed mechanical, observer_speed electrical "
      "rad/s); current_integral, current_given V and current_reference A: _x d, _y q; current_commanded: V, "
      "alpha-beta, of this tick and those before; speed_integral N m.";

  // Throws std::invalid_argument as RotorFluxOriented, for given gains that do not fit, and where no gain can be designed.
  static Constants<double> prepare(const ControllerSetup& setup, const Settings& given);
  static State<double> begin(const ControllerSetup& setup, const Constants<double>& c);

  template <class Real>
  static Command<Real> step(State<Real>& s, const Measurement<Real>& m, const Constants<Real>& c) {
    const Real half(0.5);
    const MaskOf<Real> first = s.started < half, observed = half < c.observed;
    SLIPBENCH_LABEL(first)
    const Vec2<Real> applied = applied_before(s.current.commanded, c.current.delay);
    observe(s.observer, c.observer, applied, m.current, c.orientation.pole_pairs * m.speed, first);
    s.orientation.rotor_flux = select(observed, s.observer.x.flux, s.orientation.rotor_flux);
    RotorFrame<Real> frame = orient(s.orientation, c.orientation, m, applied, first | observed);
    section<Real>("current and flux that are fed back: the observer's, or as measured and modelled; w_s by them");
    const Vec2<Real> measured = frame.current;
    frame.current = select(observed, turn_back(frame.angle, s.observer.x.current), measured);
    const Real slip = c.orientation.slip_gain * frame.current.y / frame.divisor_flux;
    frame.stator_frequency = frame.electrical_speed + slip;
    s.orientation.stator_frequency = frame.stator_frequency;
    const Vec2<Real> flux =
        select(observed, turn_back(frame.angle, s.observer.x.flux), Vec2<Real>{frame.flux, Real(0.0)});
    label_d_q("i_fed_back", frame.current);
    label_d_q("psi_fed_back", flux);
    label("w_slip", slip);
    label("w_s_fed_back", frame.stator_frequency);

    section<Real>("first tick: voltages on their way are those that hold current and flux");
    const Vec2<Real> holding = holding_voltage(c.current, frame);
    for (Vec2<Real>& u : s.current.given) u = select(first, holding, u);
    label_d_q("holding", holding);
    section<Real>("U: linear limit of the modulation times the DC link, less what dead time takes");
    const Real limit = voltage_limit(c.current.legs, m.dc_link);
    label("voltage_limit", limit);
    const Real torque = follow_speed_and_flux(s, c, m, frame, limit, s.current.asked, first);
    const VoltageCommand<Real> u =
        control_current(s.current, c.current, frame, flux, measured, s.current_reference, limit, m.dc_link);
    Command<Real> out;
    out.duty = u.duty;
    out.clipped = u.clipped;
    out.rotor_flux_reference = s.flux.reference;
    out.torque_reference = torque;
    out.current_reference = s.current_reference;
    return out;
  }
};

extern template Command<double> StateFeedback::step(State<double>&, const Measurement<double>&,
                                                    const Constants<double>&);
extern template Command<float> StateFeedback::step(State<float>&, const Measurement<float>&, const Constants<float>&);

}  // namespace slipbench
