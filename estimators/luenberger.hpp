// Full-order observer, speed-adaptive: stator current and rotor flux are copied from the machine's equations,
// the current error corrects both, and its part across the flux adapts the speed.
//
//   predict  (i, psi) over the period with the held voltage at the adapted speed w_r (estimators/believed_machine.hpp)
//   eps = i_measured - i-,   eps_d + j eps_q its parts along and across psi-
//   i   = i-   + kappa eps                             kappa = 1 - e^{-a_i T}, a_i = 4 a_w: current error, fast
//   psi = psi- - kappa L_sigma (eps - g eps_d)         g = g_d + j g_q, estimators/flux_gain.hpp
//   w_r = w_r  - T a_w a_i L_sigma eps_q / |psi-|      a_w the adaptation bandwidth, 1/s; kappa in T a_i's place
// (g along psi-; g eps_d bounded as flux_gain.hpp says).
//
// Why: the current error settles within 1 / a_i to kappa L_sigma eps = T (E_model - E). What the second line
// then adds to the model's E_model is E - E_model + g Re(E_model - E), so the flux obeys dpsi/dt = E + g (e_d
// - Re E), the reduced-order observer's law with its stability in all quadrants, motoring and generating,
// once the last line has brought Im(E_model - E) to zero. Current error and adaptation together: s^2 + a_i s
// + a_i a_w, a double pole at 2 a_w. At zero gain instead (psi = psi-) the same adaptation is unstable when
// generating at low stator frequency.
// g takes w_s from the turning of the estimated flux itself: speed and slip may be wrong together, and did
// hold a false balance. i A, psi = psi_R Wb, u V, w_r electrical rad/s, T control period s. No speed is
// measured.
// Trust: that of estimators/believed_machine.hpp, by flux and stator frequency.
// Sources: H. Kubota, K. Matsuse, T. Nakano, IEEE Trans. Ind. Appl. 29(2), 1993 (adaptation, from memory); L.
// Harnefors, M. Hinkkanen, IEEE Trans. Ind. Electron. 55(3), 2008, 1319-1329 (complete stability, full order
// from reduced order).
#pragma once

#include "estimators/believed_machine.hpp"
#include "estimators/flux_gain.hpp"

namespace slipbench {

struct Luenberger {
  static constexpr std::string_view kind = "luenberger";
  static constexpr std::array<Setting, 5> settings{{
      {"adaptation_bandwidth_Hz", "Hz", 0.1, 400.0, 60.0,
       "Bandwidth of the speed adaptation; the current error is four times as fast."},
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
    Real current_share{};  // kappa
    Real flux_share{};     // kappa L_sigma, H
    Real adaptation{};     // T a_w a_i L_sigma, V
    Real frequency_share{};
    Real per_period{};  // 1/s
    SLIPBENCH_FIELDS(machine, gain, current_share, flux_share, adaptation, frequency_share, per_period)
  };

  template <class Real>
  struct State {
    CurrentAndFlux<Real> x;
    Real speed{};                           // adapted w_r, rad/s
    Real angle{};                           // of the flux at the last tick, rad
    Real frequency{}, frequency_between{};  // filtered w_s, and after the first of the filter's two stages, rad/s
    Real started{};                         // 0 before the first sample
    SLIPBENCH_FIELDS(x, speed, angle, frequency, frequency_between, started)
  };

  static constexpr std::string_view state_note =
      "x_current A, x_flux Wb (psi_R, peak; _x alpha, _y beta); speed, frequency electrical rad/s; angle rad.";

  static Constants<double> prepare(const EstimatorSetup& setup, const Settings& given);
  static State<double> begin(const EstimatorSetup& setup, const Constants<double>& c);

  template <class Real>
  static Estimate<Real> step(State<Real>& s, const Sample<Real>& sample, const Constants<Real>& c) {
    const BelievedMachine<Real>& m = c.machine;
    const Real zero(0.0), half(0.5), one(1.0);
    const Vec2<Real> i{sample.i_alpha, sample.i_beta}, u{sample.u_alpha, sample.u_beta};
    const MaskOf<Real> first = s.started < half;
    SLIPBENCH_LABEL(first)

    const CurrentAndFlux<Real> next = ahead(m, s.x, u, s.speed).state;
    section<Real>("eps = i - i-, and its parts along and across psi-");
    const Vec2<Real> psi = select(first, s.x.flux, next.flux);
    const Vec2<Real> eps = select(first, Vec2<Real>{zero, zero}, i - next.current);
    const Real length = magnitude(psi), per_length = one / max(length, m.least_flux);
    const Vec2<Real> along = per_length * psi;  // shorter than 1 while there is hardly any flux
    const Real eps_d = dot(along, eps), eps_q = cross(along, eps);
    label_alpha_beta("psi", psi);
    label_alpha_beta("eps", eps);
    SLIPBENCH_LABEL(length, per_length, eps_d, eps_q)
    label_alpha_beta("along", along);

    const Vec2<Real> g = flux_gain(c.gain, length, s.frequency, s.speed);
    section<Real>("i = i- + kappa eps,  psi = psi- - kappa L_sigma (eps - g eps_d)");
    s.x.current = select(first, i, next.current + c.current_share * eps);
    const Real most = m.period * most_correction(c.gain, s.frequency) / (fabs(g.x) + fabs(g.y) + Real(1e-9));
    const Real pull = clamp(c.flux_share * eps_d, -most, most);
    s.x.flux = psi - c.flux_share * eps + pull * product(g, along);
    SLIPBENCH_LABEL(most, pull)
    label_alpha_beta("i_new", s.x.current);
    label_alpha_beta("psi_new", s.x.flux);
    section<Real>("w_r = w_r - T a_w a_i L_sigma eps_q / |psi-|, within bounds");
    s.speed = clamp(s.speed - c.adaptation * per_length * eps_q, -m.speed_limit, m.speed_limit);
    label("w_r", s.speed);
    s.started = one;

    // Frequency as the estimated flux really turns, not as speed and slip would have it: those may be wrong
    // together.
    Estimate<Real> out = estimate_of(m, s.x.flux, s.x.current, s.speed);
    section<Real>("w_s as the flux really turns: change of angle / T, low-passed twice");
    const Real slip = m.R_R * per_length * cross(along, s.x.current);
    const Real turning = select(first, s.speed + slip, c.per_period * wrap_angle(out.rotor_flux_angle - s.angle));
    const Real w_s = clamp(turning, -m.speed_limit, m.speed_limit), share = select(first, one, c.frequency_share);
    s.frequency_between = s.frequency_between + share * (w_s - s.frequency_between);
    s.frequency = s.frequency + share * (s.frequency_between - s.frequency);
    SLIPBENCH_LABEL(slip, turning, w_s, share)
    label("w_s_between", s.frequency_between);
    label("w_s_filtered", s.frequency);
    s.angle = out.rotor_flux_angle;
    out.trust = trust_by_frequency(m, s.x.flux, s.frequency);
    return out;
  }
};

}  // namespace slipbench
