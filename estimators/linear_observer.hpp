// Linear observer with measured speed: stator current and rotor flux, full order, gains scheduled over speed.
//
//   plant/current_flux_observer.hpp: the machine at the measured speed, corrected by M(|w_r|) (i - i-)
//
// Gains: given as L (from a gain file), else the stationary Kalman gain of the three noises at each of
// gain_frequency_Hz. Speed is passed through as measured; without a speed sensor there is nothing to pass. Trust: the share of the
// nominal flux, full from one half on. Source: as the header named, and R.E. Kalman, R.S. Bucy, Trans. ASME D 83, 1961.
#pragma once

#include "estimators/believed_machine.hpp"
#include "plant/current_flux_observer.hpp"

namespace slipbench {

struct LinearObserver {
  static constexpr std::string_view kind = "linear_observer";
  static constexpr bool needs_speed = true;  // from a sensor
  static constexpr std::array<Setting, 6> settings{{
      {"measured_current_noise_A", "A", 1e-9, 1e6, derived,
       "Noise of a current sensor, rms a phase, that gains are designed for; derived: the sensor's, at least 0.1 % of "
       "rated peak current."},
      {"process_voltage_V", "V", 0.0, 1e6, derived,
       "Voltage error, rms and fresh each control period, likewise; derived: 0.5 % of rated phase peak."},
      {"process_flux_Wb", "Wb", 0.0, 1e3, derived,
       "Rms added to each rotor flux component a control period, likewise; derived: a walk of 2 % of nominal over 1 "
       "s."},
      {"gain_period_s", "s", 1e-9, 1.0, derived,
       "Control period that given gains belong to; another one is refused; derived: not checked."},
      {"gain_frequency_Hz", "Hz", 0.0, 1e5, derived,
       "Electrical speeds p n / 60 that gains belong to, rising from 0, 7 at most; derived: 0 to three times rated.",
       false, SettingShape::list},
      {"L", "", -1e9, 1e9, derived,
       "Gain on the current's error, rows i (1) and psi_r (H), 4 x 2 at each speed, rotating (a, -b; b, a); derived: "
       "stationary Kalman gain.",
       false, SettingShape::matrices},
  }};

  template <class Real>
  struct Constants {
    BelievedMachine<Real> machine;
    ObserverConstants<Real> observer;
    SLIPBENCH_FIELDS(machine, observer)
  };

  template <class Real>
  struct State {
    ObserverState<Real> observer;
    Real started{};  // 0 before the first sample
    SLIPBENCH_FIELDS(observer, started)
  };

  static constexpr std::string_view state_note =
      "observer_x_current A, observer_x_flux Wb (psi_r, peak; _x alpha, _y beta); observer_speed electrical rad/s.";

  // Throws std::invalid_argument for given gains that do not fit, and where none can be designed.
  static Constants<double> prepare(const EstimatorSetup& setup, const Settings& given);
  static State<double> begin(const EstimatorSetup& setup, const Constants<double>& c);
  // `given` with its tables complete.
  static Settings with_gains(const EstimatorSetup& setup, const Settings& given);

  template <class Real>
  static Estimate<Real> step(State<Real>& s, const Sample<Real>& sample, const Constants<Real>& c) {
    const BelievedMachine<Real>& m = c.machine;
    const MaskOf<Real> first = s.started < Real(0.5);
    SLIPBENCH_LABEL(first)
    const Real w_r = m.pole_pairs * sample.speed;
    observe(s.observer, c.observer, Vec2<Real>{sample.u_alpha, sample.u_beta},
            Vec2<Real>{sample.i_alpha, sample.i_beta}, w_r, first);
    s.started = Real(1.0);
    const Vec2<Real> flux = c.observer.model.flux_ratio * s.observer.x.flux;  // psi_R
    Estimate<Real> out = estimate_of(m, flux, s.observer.x.current, w_r);
    out.speed = sample.speed;
    section<Real>("trust = share of nominal flux, full from one half on");
    out.trust = min(Real(2.0) * m.per_nominal_flux * magnitude(flux), Real(1.0));
    return out;
  }
};

}  // namespace slipbench
