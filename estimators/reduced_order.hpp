// Reduced-order observer: rotor flux by integrating the back-EMF, two states, no current differentiated;
// speed is stator frequency less slip, filtered.
//
// Over a period, in the stationary frame, E = u - R_s i - L_sigma di/dt integrates to
//   v = T (u - R_s (i_k + i_{k-1}) / 2) - L_sigma (i_k - i_{k-1})
// whose differences of current telescope: current noise enters the flux once and does not pile up. Then
//   psi_k = psi_{k-1} + v + g T (e_d - Re E) along the estimated flux,   e_d = R_R i_d - alpha |psi|
// with g from estimators/flux_gain.hpp (stable for every speed and load while w_s is not zero). Directions
// are those of the chord's middle, (psi_{k-1} + psi_{k-1} + v) / 2, so that a steady rotation leaves no
// radial part at any frequency. Below 5 % of the nominal flux its direction means nothing: v is integrated
// with a leak, -alpha T psi, until there is more.
//   w_s = (arg psi_k - arg psi_{k-1}) / T,   slip = R_R i_q / |psi|,   w_r = lowpass(w_s - slip)
// psi rotor flux psi_R Wb, i A, u V, T control period s, w electrical rad/s.
// Trust = (|psi| / half the nominal, at most 1) w_s^2 / (w_s^2 + w_1^2), w_1 = 2 pi 0.5 Hz: none without
// flux, and less and less towards zero stator frequency, where speed cannot be observed.
// Source: L. Harnefors, M. Hinkkanen, IEEE Trans. Ind. Electron. 55(3), 2008, 1319-1329; discretisation is
// this file's.
#pragma once

#include "estimators/believed_machine.hpp"
#include "estimators/flux_gain.hpp"

namespace slipbench {

struct ReducedOrder {
  static constexpr std::string_view kind = "reduced_order";
  static constexpr std::array<Setting, 5> settings{{
      {"speed_filter_Hz", "Hz", 0.1, 2000.0, 80.0,
       "Corner of the low-pass (two equal first-order stages) on the speed estimate."},
      {"frequency_filter_Hz", "Hz", 0.1, 2000.0, 10.0,
       "Corner of the low-pass (two equal stages) on the frequency that sets the gain."},
      {"flux_damping", "", 0.05, 5.0, 0.7, "Damping ratio of the flux error, zeta in A = alpha + 2 zeta |w_s|."},
      {"flux_stiffness", "", 0.0, 10.0, 1.0,
       "Extra stiffness of the flux error at low frequency, in units of 1 / rotor time constant."},
      {"flux_bandwidth_limit_Hz", "Hz", 0.1, 1000.0, 15.0, "Stator frequency above which damping grows no further."},
  }};

  template <class Real>
  struct Constants {
    BelievedMachine<Real> machine;
    FluxGain<Real> gain;
    Real speed_share{}, frequency_share{};
    Real per_period{};
    SLIPBENCH_FIELDS(machine, gain, speed_share, frequency_share, per_period)
  };

  template <class Real>
  struct State {
    Vec2<Real> flux, current;                   // psi_R and the current at the last tick
    Real angle{};                               // of the flux at the last tick, rad
    Real frequency{}, speed{};                  // filtered w_s and w_r, rad/s
    Real frequency_between{}, speed_between{};  // after the first of each filter's two stages
    Real started{};                             // 0 before the first sample
    SLIPBENCH_FIELDS(flux, current, angle, frequency, speed, frequency_between, speed_between, started)
  };

  static constexpr std::string_view state_note =
      "flux Wb (psi_R, peak), current A (_x alpha, _y beta); speed, frequency electrical rad/s; angle rad.";

  static Constants<double> prepare(const EstimatorSetup& setup, const Settings& given);
  static State<double> begin(const EstimatorSetup& setup, const Constants<double>& c);

  template <class Real>
  static Estimate<Real> step(State<Real>& s, const Sample<Real>& sample, const Constants<Real>& c) {
    const BelievedMachine<Real>& m = c.machine;
    const Real zero(0.0), half(0.5), one(1.0);
    const Vec2<Real> i{sample.i_alpha, sample.i_beta}, u{sample.u_alpha, sample.u_beta};
    const MaskOf<Real> first = s.started < half;

    label("first", first);
    section<Real>("v = T (u - R_s i_middle) - L_sigma (i - i_before): the back-EMF over the period");
    const Vec2<Real> before = select(first, i, s.current), i_middle = half * (i + before);
    const Vec2<Real> v = m.period * (u - m.R_s * i_middle) - m.L_sigma * (i - before);
    label_alpha_beta("i_before", before);
    label_alpha_beta("i_middle", i_middle);
    label_alpha_beta("v", v);
    section<Real>("direction of the flux in the middle of the period");
    const Vec2<Real> middle = s.flux + half * v;
    const Real length = magnitude(middle), per_length = one / max(length, m.least_flux);
    const Vec2<Real> along =
        per_length * middle;  // shorter than 1 while there is hardly any flux: nothing to correct by
    const Real i_d = dot(along, i_middle), i_q = cross(along, i_middle);
    label_alpha_beta("along", along);
    SLIPBENCH_LABEL(length, per_length, i_d, i_q)
    section<Real>("T (e_d - Re E): what the model of the rotor says of the flux's growth, less what was integrated");
    const Real wrong = m.period * (m.R_R * i_d - m.alpha * length) - dot(along, v);
    label("wrong", wrong);
    const Vec2<Real> g = flux_gain(c.gain, length, s.frequency, s.speed);
    section<Real>("psi = psi + v + g T (e_d - Re E); hardly any flux: + v - alpha T psi");
    const MaskOf<Real> alive = length > m.least_flux;
    const Vec2<Real> correction = select(alive, wrong * product(g, along), -(m.period * m.alpha) * s.flux);
    s.flux = select(first, s.flux, s.flux + v + correction);
    s.current = i;
    SLIPBENCH_LABEL(alive)
    label_alpha_beta("correction", correction);
    label_alpha_beta("psi", s.flux);

    Estimate<Real> out = estimate_of(m, s.flux, i, s.speed);
    section<Real>("w_s = change of angle / T,  slip = R_R i_q / |psi|,  w_r = w_s - slip");
    const Real slip = select(alive, m.R_R * i_q * per_length, zero);
    const Real turning = select(first, s.speed + slip, c.per_period * wrap_angle(out.rotor_flux_angle - s.angle));
    const Real w_s = clamp(turning, -m.speed_limit, m.speed_limit);
    const Real w_r = clamp(w_s - slip, -m.speed_limit, m.speed_limit);
    SLIPBENCH_LABEL(slip, turning, w_s, w_r)
    section<Real>("low-passes of two stages each, held while there is hardly any flux");
    // Held while there is hardly any flux, and slow at first: the direction's noise goes with 1 / length.
    const Real moves = select(alive, min(square(Real(4.0) * m.per_nominal_flux * length), one), zero);
    const Real frequency_share = select(first, one, moves * c.frequency_share), speed_share = moves * c.speed_share;
    s.frequency_between = s.frequency_between + frequency_share * (w_s - s.frequency_between);
    s.frequency = s.frequency + frequency_share * (s.frequency_between - s.frequency);
    s.speed_between = s.speed_between + speed_share * (w_r - s.speed_between);
    s.speed = s.speed + speed_share * (s.speed_between - s.speed);
    s.angle = out.rotor_flux_angle;
    s.started = one;
    SLIPBENCH_LABEL(moves, frequency_share, speed_share)
    label("w_s_between", s.frequency_between);
    label("w_s_filtered", s.frequency);
    label("w_r_between", s.speed_between);
    label("w_r_filtered", s.speed);

    out.speed = s.speed / m.pole_pairs;
    out.trust = trust_by_frequency(m, s.flux, s.frequency);
    return out;
  }
};

}  // namespace slipbench
