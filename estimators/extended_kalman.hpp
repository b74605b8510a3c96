// Extended Kalman filter: stator currents, rotor fluxes, speed and (if set) load torque.
//
//   x = (i, psi, w_r, T_load)      i A, psi = psi_R Wb in the stationary frame, w_r electrical rad/s, T_load N m
//   (i, psi)+ = series of estimators/believed_machine.hpp at w_r with the held voltage
//   w_r+      = w_r + T p / J (torque - T_load - b w_r / p)     with load_torque = 1;    w_r+ = w_r with 0: a random walk
//   P-  = F P F' + Q,   y = i_measured - i-,   S = P-_ii + R,   K = P-_(.,i) S^-1
//   x   = x- + K y,     P = (1 - K H) P- (1 - K H)' + K R K'    (Joseph's form, each entry once: symmetric)
//
// F is written by hand below. R for three current sensors of variance s^2 is (2/3) s^2 1, for two s^2 [1,
// 1/sqrt3; 1/sqrt3, 5/3] (alpha = i_a, beta = (i_a + 2 i_b) / sqrt3: correlated). The speed's and the load's
// variance are bounded by a congruence, so that a machine without flux, which tells nothing about them,
// cannot drive them beyond numbers that mean something. A filter that is lost while sure of itself stays
// lost, but from nothing (no flux, no speed) it finds a running machine within 50 ms. So it begins anew where
// it cannot be right: speed past 2.5 times rated, or y' S^-1 y, 2 on average, above 100 for 0.3 s.
// Trust = (|psi| / half the nominal, at most 1) / (1 + (deviation of the speed / 2 % of rated)^2), by the
// filter's own covariance.
// Source: R.E. Kalman, J. Basic Eng. 82, 1960; P.D. Joseph's form as in R.S. Bucy, P.D. Joseph, "Filtering
// for Stochastic Processes with Applications to Guidance", 1968 (from memory); default tuning is this
// project's, see the .cpp.
#pragma once

#include "estimators/believed_machine.hpp"
#include "estimators/kalman_model.hpp"

namespace slipbench {

struct ExtendedKalman {
  static constexpr std::string_view kind = "extended_kalman";
  static constexpr std::array<Setting, 12> settings{{
      {"load_torque", "", 0.0, 1.0, 0.0,
       "1: the load torque is a state and speed follows the shaft equation; 0: speed is a random walk.", true},
      {"measured_current_noise_A", "A", 1e-9, 1e6, derived,
       "Noise of a current sensor, rms a phase; derived: the sensor's, at least 0.1 % of rated peak current."},
      {"process_current_A", "A", 0.0, 1e6, derived,
       "Process noise of each current component, rms added a control period; derived from process_voltage_V."},
      {"process_voltage_V", "V", 0.0, 1e6, derived,
       "Voltage error, rms and fresh each control period; derived: 0.5 % of rated phase peak."},
      {"process_flux_Wb", "Wb", 0.0, 1e3, derived,
       "Process noise of each rotor flux component, rms added a control period; derived: a walk of 2 % of nominal over "
       "1 s."},
      {"process_speed_rad_s", "rad/s", 0.0, 1e6, derived,
       "Random walk of the mechanical speed, rms over 1 s; derived: 10 % of synchronous."},
      {"process_load_torque_Nm", "N m", 0.0, 1e9, derived,
       "Random walk of the load torque, rms over 1 s; derived: twice rated."},
      {"initial_current_A", "A", 0.0, 1e6, derived,
       "Deviation of each current component at the start; derived: 10 % of rated peak."},
      {"initial_flux_Wb", "Wb", 0.0, 1e3, derived,
       "Deviation of each rotor flux component at the start; derived: 2 % of nominal."},
      {"initial_speed_rad_s", "rad/s", 0.0, 1e6, derived,
       "Deviation of the mechanical speed at the start; derived: 2 % of synchronous."},
      {"initial_load_torque_Nm", "N m", 0.0, 1e9, derived,
       "Deviation of the load torque at the start; derived: rated torque."},
      {"inertia_kgm2", "kg m2", 1e-9, 1e9, derived, "Inertia of the shaft equation; derived: as believed."},
  }};

  static constexpr double lost_surprise = 100.0, surprise_filter_Hz = 0.5;

  template <class Real>
  struct Constants {
    KalmanModel<Real> model;
    std::array<Real, 6> process;  // Q, diagonal
    Vec2<Real> noise_diagonal;    // R: alpha, beta
    Real noise_cross{};
    std::array<Real, 2> most;             // bounds on the variance of w_r and of T_load
    Real per_doubt{};                     // 1 / (2 % of rated electrical speed)^2
    Real surprise_share{};                // of the low-pass on y' S^-1 y
    Real lost_speed{};                    // electrical rad/s
    std::array<Real, 4> start_deviation;  // of a current, a flux component (psi_R), w_r, T_load
    SLIPBENCH_FIELDS(model, process, noise_diagonal, noise_cross, most, per_doubt, surprise_share, lost_speed,
                     start_deviation)
  };

  template <class Real>
  struct State {
    KalmanVector<Real> x;
    Symmetric6<Real> P;
    Real surprise{};  // y' S^-1 y, filtered
    Real started{};   // 0 before the first sample, which corrects without a prediction
    SLIPBENCH_FIELDS(x, P, surprise, started)
  };

  static constexpr std::array<std::size_t, 6> start_kind{0, 0, 1, 1, 2, 3};  // which start_deviation a state has

  static constexpr std::string_view state_note =
      "x_current A, x_flux Wb (psi_R, peak; _x alpha, _y beta), x_speed electrical rad/s, x_load_torque N m; P_entryRC "
      "their "
      "covariance in that order.";

  static Constants<double> prepare(const EstimatorSetup& setup, const Settings& given);
  static State<double> begin(const EstimatorSetup& setup, const Constants<double>& c);

  // P- = F P F' + Q and x- = f(x, u).
  template <class Real>
  static void predict(KalmanVector<Real>& x, Symmetric6<Real>& P, const Vec2<Real>& voltage, const Constants<Real>& c) {
    const KalmanPrediction<Real> next = predict_with_jacobian(c.model, x, voltage);
    x = next.x;
    P = sandwich(next.F, P, has_load(c.model));
    section<Real>("P- = F P F' + Q");
    for (std::size_t n = 0; n < 6; ++n) P.set(n, n, P(n, n) + c.process[n]);
    label_entries("P_ahead", P.entry);
  }

  // Innovation y and its covariance S (11, 12, 22), for consistency tests.
  template <class Real>
  struct Innovation {
    Vec2<Real> y, S_diagonal;
    Real S_cross{};
    [[nodiscard]] Real normalised() const {  // y' S^-1 y, 2 on average for a consistent filter
      const Real det = S_diagonal.x * S_diagonal.y - S_cross * S_cross;
      return (S_diagonal.y * y.x * y.x - Real(2.0) * S_cross * y.x * y.y + S_diagonal.x * y.y * y.y) / det;
    }
  };

  template <class Real>
  static Innovation<Real> correct(KalmanVector<Real>& x, Symmetric6<Real>& P, const Vec2<Real>& measured,
                                  const Constants<Real>& c) {
    section<Real>("innovation y = i - i-,  S = P-_ii + R,  its inverse");
    const Innovation<Real> in{
        measured - x.current, {P(0, 0) + c.noise_diagonal.x, P(1, 1) + c.noise_diagonal.y}, P(0, 1) + c.noise_cross};
    const Real per_det = Real(1.0) / (in.S_diagonal.x * in.S_diagonal.y - in.S_cross * in.S_cross);
    const Real s11 = per_det * in.S_diagonal.y, s12 = -per_det * in.S_cross, s22 = per_det * in.S_diagonal.x;
    label_alpha_beta("y", in.y);
    label_alpha_beta("S", in.S_diagonal);
    label("S_cross", in.S_cross);
    SLIPBENCH_LABEL(per_det, s11, s12, s22)
    section<Real>("K = P-_(.,i) S^-1");
    const bool load = has_load(c.model), crossed = any(c.noise_cross > Real(0.0));  // two sensors
    Mat<Real, 6, 2> K{};
    for (std::size_t n = 0; n < 6; ++n) {
      if (n == 5 && !load) continue;
      K[n] = {P(n, 0) * s11 + P(n, 1) * s12, P(n, 0) * s12 + P(n, 1) * s22};
    }
    label_entries("K", K);
    section<Real>("x = x- + K y");
    const auto gain = [&](std::size_t n) { return K[n][0] * in.y.x + K[n][1] * in.y.y; };
    x.current = x.current + Vec2<Real>{gain(0), gain(1)};
    x.flux = x.flux + Vec2<Real>{gain(2), gain(3)};
    x.speed = clamp(x.speed + gain(4), -c.model.machine.speed_limit, c.model.machine.speed_limit);
    if (load) x.load_torque = x.load_torque + gain(5);
    label_alpha_beta("i_corrected", x.current);
    label_alpha_beta("psi_corrected", x.flux);
    label("w_corrected", x.speed);
    label("load_corrected", x.load_torque);

    // M = (1 - K H) P-, then P = M (1 - K H)' + K R K'.
    section<Real>("M = (1 - K H) P-");
    Mat<Real, 6, 6> M;
    for (std::size_t r = 0; r < 6; ++r) {
      if (r == 5 && !load) continue;
      for (std::size_t n = 0; n < 6; ++n) M[r][n] = P(r, n) - (K[r][0] * P(0, n) + K[r][1] * P(1, n));
    }
    label_entries("M", M);
    section<Real>("P = M (1 - K H)' + K R K' (Joseph's form, each entry once)");
    for (std::size_t r = 0; r < 6; ++r) {
      Real kr0 = K[r][0] * c.noise_diagonal.x, kr1 = K[r][1] * c.noise_diagonal.y;
      if (crossed) {
        kr0 = kr0 + K[r][1] * c.noise_cross;
        kr1 = kr1 + K[r][0] * c.noise_cross;
      }
      for (std::size_t n = r; n < 6; ++n) {
        if (n == 5 && !load) continue;
        P.set(r, n, (M[r][n] - (M[r][0] * K[n][0] + M[r][1] * K[n][1])) + (kr0 * K[n][0] + kr1 * K[n][1]));
      }
    }
    return in;
  }

  template <class Real>
  static void restart_if_lost(State<Real>& s, const Vec2<Real>& current, const Constants<Real>& c) {
    section<Real>("lost: speed beyond any, or innovations that cannot be; then all begins anew");
    const Real zero(0.0), one(1.0);
    const Real wild = select(fabs(s.x.speed) > c.lost_speed, one, zero);
    const Real astray = select(s.surprise > Real(lost_surprise), one, zero);
    const MaskOf<Real> lost = wild + astray > zero;
    label("surprise_filtered", s.surprise);
    label_entries("P_corrected", s.P.entry);
    SLIPBENCH_LABEL(wild, astray, lost)
    if (surely_none(lost)) return;
    s.x = select(lost, KalmanVector<Real>{current, {zero, zero}, zero, zero}, s.x);
    s.surprise = select(lost, zero, s.surprise);
    for (std::size_t r = 0; r < 6; ++r) {
      for (std::size_t n = r; n < 6; ++n) {
        const Real fresh = r == n ? square(c.start_deviation[start_kind[r]]) : zero;
        s.P.set(r, n, select(lost, fresh, s.P(r, n)));
      }
    }
  }

  template <class Real>
  static Estimate<Real> step(State<Real>& s, const Sample<Real>& sample, const Constants<Real>& c) {
    const BelievedMachine<Real>& m = c.model.machine;
    const Real half(0.5), one(1.0);
    const MaskOf<Real> first = s.started < half;
    SLIPBENCH_LABEL(first)
    const Vec2<Real> u{sample.u_alpha, sample.u_beta};
    if (surely_none(first)) {
      predict(s.x, s.P, u, c);
    } else {
      KalmanVector<Real> x = s.x;
      Symmetric6<Real> P = s.P;
      predict(x, P, u, c);
      section<Real>("the first sample corrects without a prediction");
      s.x = select(first, s.x, x);
      for (std::size_t r = 0; r < 6; ++r) {
        for (std::size_t n = r; n < 6; ++n) s.P.set(r, n, select(first, s.P(r, n), P(r, n)));
      }
    }
    label_entries("P_prior", s.P.entry);
    label_alpha_beta("i_prior", s.x.current);
    label_alpha_beta("psi_prior", s.x.flux);
    label("w_prior", s.x.speed);
    const Vec2<Real> i{sample.i_alpha, sample.i_beta};
    const Innovation<Real> in = correct(s.x, s.P, i, c);
    section<Real>("surprise: y' S^-1 y, low-passed; 2 on average while all is well");
    s.surprise = s.surprise + c.surprise_share * (min(in.normalised(), Real(1000.0)) - s.surprise);
    restart_if_lost(s, i, c);
    label_entries("P_kept", s.P.entry);
    bound_variance(s.P, 4, c.most[0]);
    bound_variance(s.P, 5, c.most[1]);
    s.started = one;

    Estimate<Real> out = estimate_of(m, s.x.flux, s.x.current, s.x.speed);
    const Real known = min(Real(2.0) * m.per_nominal_flux * magnitude(s.x.flux), one);
    section<Real>("trust = share of nominal flux / (1 + variance of the speed over (2 % of rated)^2)");
    out.trust = known / (one + c.per_doubt * s.P(4, 4));
    section<Real>("covariance of (psi_r_alpha, psi_r_beta, speed), T circuit and mechanical");
    out.has_covariance = one;
    const Real f = m.per_flux_ratio, w = one / m.pole_pairs;
    out.covariance = {f * f * s.P(2, 2), f * f * s.P(2, 3), f * w * s.P(2, 4),
                      f * f * s.P(3, 3), f * w * s.P(3, 4), w * w * s.P(4, 4)};
    return out;
  }
};

}  // namespace slipbench
