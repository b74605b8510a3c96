// Voltage/frequency control without speed sensor or estimator: stator flux held by voltage, slip compensated from the torque.
//
//   frame      turns at w_e; its x axis is where the stator flux shall lie, psi = psi_r,ref L_s / L_m
//   frequency  w_e = w + s w_slip - k_d (i_y - i_y,slow)                  w: frequency_ramp.hpp, ramp and stall prevention
//   voltage    u = b R_s (i_x + j i_y) + j w_e psi                        IR boost as a vector
//   load       T = 3/2 p Im(conj(psi_hat) i),  psi_hat = psi + j (1 - b) R_s i / w_e,  i_y and i measured and filtered;
//              w_slip and i_x are those of the circuit at that torque (held_stator_flux.hpp)
//   limit      psi <= (sqrt(U^2 - u_x^2) - sgn(w) b R_s i_y) / |w_e|: field weakening by itself
//
// With b = 1 and parameters believed right u is exactly what the flux asks for at any load; |u| = R_s i cos phi + sqrt((w psi)^2 -
// (R_s i sin phi)^2) is the same in scalars. i_x from the torque instead of measured leaves the stator resistance its damping of
// flux that stands still; measured, R_s i would be fed back whole and that flux never die out. k_d gives way to
// quick torque alone and damps the light-load oscillation of voltage-fed machines. With s = 1 slip compensation is the integral
// part of a speed control: w_slip is about T over the machine's own stiffness, so its filter is kept slower than that loop.
// The legs' dead time goes by the current measured now: a filtered one lags, and its sign feeds the light-load oscillation.
// Near zero stator frequency (braking at slip speed) the voltage tells nothing of the flux, here as anywhere: below about 2 Hz
// a braking machine is not held.
//
// b `ir_boost`, s `slip_compensation`, U voltage limit, psi Wb (peak), i A (peak), w electrical rad/s, R_s ohm.
// Source: A. Munoz-Garcia, T.A. Lipo, D.W. Novotny, "A new induction motor V/f control method capable of high-performance
// regulation at low speeds", IEEE Trans. Ind. Appl. 34(4), 1998, 813-821 (from memory); the vector form, i_x and filters
// derived here.
#pragma once

#include "controllers/frequency_ramp.hpp"
#include "controllers/held_stator_flux.hpp"
#include "controllers/legs.hpp"
#include "controllers/magnetise_at_rest.hpp"

namespace slipbench {

struct VoltsPerHertz {
  static constexpr std::string_view kind = "volts_per_hertz";
  static constexpr bool takes_speed = false;
  static constexpr std::array<Setting, 7> settings{{
      {"frequency_ramp_Hz_per_s", "Hz/s", 0.01, 1e5, derived,
       "how fast the frequency may change; default what half the rated torque gives the inertia; never faster than "
       "the current can be held, rated slip in 2 sigma tau_r"},
      {"ir_boost", "", 0.0, 1.0, 1.0, "share of the stator's resistive drop that is added to the voltage"},
      {"slip_compensation", "", 0.0, 1.0, 1.0, "share of the slip that is added to the frequency"},
      {"damping", "", 0.0, 10.0, 1.0, "frequency given way to quick torque, as a share of the slip that belongs to it"},
      {"current_filter_s", "s", 1e-3, 1.0, 0.02, "low pass on the current behind boost and torque"},
      {"slip_filter_s", "s", 1e-3, 100.0, derived,
       "low pass on the compensated slip; default 4 times the shaft's time constant on the machine's slip, at least "
       "0.1 s"},
      {"current_limit_peak_A", "A", 0.001, 1e6, derived,
       "stator current's peak at which the frequency gives way; default twice the rated peak"},
  }};

  template <class Real>
  struct Constants {
    Real flux{}, flux_ratio{};                     // psi, L_m / L_s
    Real boost{}, missing_boost{};                 // b R_s, (1 - b) R_s
    Real slip_share{}, damping{}, most_damping{};  // s, k_d rad/s per A, rad/s
    Real filter{}, slow_filter{}, slip_filter{};   // shares of the way per period
    Real least_flux{}, frequency_floor{};
    Real period{};
    Real leakage{}, rotor_share{}, start_flux{};  // sigma L_s, L_m / L_r, rotor flux at tick 0 along alpha
    Real start_frequency{};
    HeldFluxConstants<Real> load;
    FrequencyRampConstants<Real> ramp;
    MagnetiseConstants<Real> magnetise;
    LegConstants<Real> legs;
    SLIPBENCH_FIELDS(flux, flux_ratio, boost, missing_boost, slip_share, damping, most_damping, filter, slow_filter,
                     slip_filter, least_flux, frequency_floor, period, leakage, rotor_share, start_flux,
                     start_frequency, load, ramp, magnetise, legs)
  };

  template <class Real>
  struct State {
    Real angle{};             // of the frame, rad, within half a turn
    Real frequency{};         // w
    Real stator_frequency{};  // w_e of the tick before
    Real flux{};              // psi, after the voltage limit
    Real i_x_per_flux{};      // of the tick before
    Real slip{}, slow_i_y{};
    Vec2<Real> current;  // filtered, in the frame
    MagnetiseState<Real> magnetise;
    Real started{};  // 0 at the first tick
    SLIPBENCH_FIELDS(angle, frequency, stator_frequency, flux, i_x_per_flux, slip, slow_i_y, current, magnetise,
                     started)
  };

  static constexpr std::string_view state_note =
      "angle rad; frequency, stator_frequency, slip electrical rad/s; flux Wb (stator, peak); current A in the frame.";

  // Throws std::invalid_argument for a delay outside 0..2 periods, torque control, and data without which no gain exists.
  static Constants<double> prepare(const ControllerSetup& setup, const Settings& given);
  static State<double> begin(const ControllerSetup& setup, const Constants<double>& c);

  template <class Real>
  static Command<Real> step(State<Real>& s, const Measurement<Real>& m, const Constants<Real>& c) {
    const Real zero(0.0), one(1.0), half(0.5);
    const MaskOf<Real> first = s.started < half;
    s.started = one;
    SLIPBENCH_LABEL(first)
    section<Real>("frame: its x axis is where the stator flux shall lie; currents seen from it, filtered");
    // A machine that is taken over has its rotor flux along alpha; its stator flux follows from the current.
    const Vec2<Real> found = c.leakage * m.current + Vec2<Real>{c.rotor_share * c.start_flux, zero};
    s.angle = select(first, select(zero < c.start_flux, atan2(found.y, found.x), zero), s.angle);
    const SinCos<Real> angle = sincos(s.angle);
    const Vec2<Real> current = turn_back(angle, m.current);
    s.current = select(first, current, s.current + c.filter * (current - s.current));
    s.slow_i_y = select(first, current.y, s.slow_i_y + c.slow_filter * (current.y - s.slow_i_y));

    label_d_q("i", current);
    label_d_q("i_filtered", s.current);
    label("i_q_slow", s.slow_i_y);

    section<Real>("T = 3/2 p Im(conj(psi_hat) i),  psi_hat = psi + j (1 - b) R_s i / w_e");
    const LoadPoint<Real> load = load_point_of(s, c);
    label("slip_of_load", load.slip);
    s.slip = select(first, load.slip, s.slip + c.slip_filter * (load.slip - s.slip));
    const Vec2<Real> standing = magnetise(s.magnetise, c.magnetise, current, m.speed_reference);
    const MaskOf<Real> hold = s.magnetise.done < half;
    label("slip", s.slip);
    SLIPBENCH_LABEL(hold)
    const Real excess = step_frequency(s.frequency, c.ramp, m.speed_reference, magnitude(m.current), current.y, hold);
    section<Real>("w_e = w + s w_slip - k_d (i_y - i_y,slow), less what the current limit takes");
    const Real damped = clamp(c.damping * (current.y - s.slow_i_y), -c.most_damping, c.most_damping);
    s.stator_frequency = select(hold, zero, s.frequency + c.slip_share * s.slip - damped - excess);

    SLIPBENCH_LABEL(damped)
    label("w_e", s.stator_frequency);

    section<Real>("psi <= (sqrt(U^2 - u_x^2) - sgn(w) b R_s i_y) / |w_e|");
    const Real limit = voltage_limit(c.legs, m.dc_link);
    label("voltage_limit", limit);
    s.flux = reachable_flux(s, c, limit);
    label("psi", s.flux);
    section<Real>("u = b R_s (i_x + j i_y) + j w_e psi, within the circle");
    s.i_x_per_flux = load.i_x_per_flux;
    const Vec2<Real> turning{c.boost * load.i_x_per_flux * s.flux, c.boost * s.current.y + s.stator_frequency * s.flux};
    const Vec2<Real> wanted = select(hold, standing, turning);
    const Vec2<Real> limited = min(one, limit / max(magnitude(wanted), Real(1e-3))) * wanted;
    label_d_q("wanted", wanted);
    label_d_q("u", limited);
    const LegCommand<Real> legs = command_legs(c.legs, angle, s.stator_frequency, limited, current, m.dc_link);

    section<Real>("angle(k+1) = angle + T w_e, within half a turn");
    const Real turned = s.angle + c.period * s.stator_frequency, turn(6.28318530717958647692);
    s.angle = turned - turn * floor(turned / turn + half);
    Command<Real> out;
    out.duty = legs.duty;
    out.clipped = clipped_by(limited - wanted, legs.by_rails, limit);
    out.rotor_flux_reference = c.flux_ratio * s.flux;
    return out;
  }

 private:
  // Where the machine works, from the filtered current and the flux that the voltage of the tick before holds.
  template <class Real>
  static LoadPoint<Real> load_point_of(const State<Real>& s, const Constants<Real>& c) {
    const Real w = select(s.stator_frequency < Real(0.0), min(s.stator_frequency, -c.frequency_floor),
                          max(s.stator_frequency, c.frequency_floor));
    const Vec2<Real> flux = Vec2<Real>{s.flux, Real(0.0)} + (c.missing_boost / w) * quarter_turn(s.current);
    const Real torque = c.load.torque_per_flux_current * cross(flux, s.current);
    return load_point(c.load, torque, max(dot(flux, flux), square(c.least_flux)));
  }

  template <class Real>
  static Real reachable_flux(const State<Real>& s, const Constants<Real>& c, const Real& limit) {
    const Real along = c.boost * s.i_x_per_flux * s.flux, w = s.stator_frequency;
    // A thousandth is left, so that rounding and the filters' lag do not count as clipped.
    const Real across = Real(0.999) * sqrt(max(square(limit) - square(along), Real(0.0)));
    const Real drop = select(w < Real(0.0), -c.boost * s.current.y, c.boost * s.current.y);
    return clamp((across - drop) / max(fabs(w), c.frequency_floor), c.least_flux, c.flux);
  }
};

extern template Command<double> VoltsPerHertz::step(State<double>&, const Measurement<double>&,
                                                    const Constants<double>&);
extern template Command<float> VoltsPerHertz::step(State<float>&, const Measurement<float>&, const Constants<float>&);

}  // namespace slipbench
