// Voltage-model flux estimator: the stator's back-EMF through a low-pass instead of an integrator; speed is stator
// frequency less slip.
//
//   psi_s[k] = e^{-w_c T} psi_s[k-1] + T (u - R_s (i[k] + i[k-1]) / 2)       w_c = 2 pi drift_corner_Hz
//   psi_r = (L_r / L_m) (psi_s - sigma L_s i),   sigma L_s = L_s - L_m^2 / L_r
//   w_s = (arg psi_r[k] - arg psi_r[k-1]) / T,   slip = R_r (L_m / L_r) i_q / |psi_r|,   speed = lowpass(w_s - slip) / p
//
// psi Wb, i A, u V, T control period s, w electrical rad/s. The low-pass forgets offsets and a wrong start; it costs
// amplitude and phase where w_s comes near w_c, so at creep speed this estimate is poor: it is a first one to copy.
// Source: P. Vas, "Sensorless Vector and Direct Torque Control", 1998, ch. 4 (from memory); discretisation is this file's.
#pragma once

#include "estimators/believed_machine.hpp"
#include "sim/engine/own_methods.hpp"

// Inside slipbench, so that exp, sqrt, select, max mean its own: those of the C library differ between processors.
namespace slipbench::outside {

struct VoltageModel {
  static constexpr std::string_view kind = "voltage_model";
  static constexpr std::array<Setting, 2> settings{{
      {"drift_corner_Hz", "Hz", 0.01, 20.0, 0.5, "Corner of the low-pass that stands for the integrator."},
      {"speed_filter_Hz", "Hz", 0.1, 2000.0, 15.0, "Corner of the low-pass on the speed estimate."},
  }};

  template <class Real>
  struct Constants {
    Real period{}, keep{}, speed_share{}, R_s{}, R_slip{}, L_sigma{}, flux_ratio{}, torque_factor{}, pole_pairs{};
    Real least_flux{}, speed_limit{};
    SLIPBENCH_FIELDS(period, keep, speed_share, R_s, R_slip, L_sigma, flux_ratio, torque_factor, pole_pairs, least_flux,
                     speed_limit)
  };
  template <class Real>
  struct State {
    Vec2<Real> stator_flux, current;
    Real angle{}, speed{};  // rad, electrical rad/s
    SLIPBENCH_FIELDS(stator_flux, current, angle, speed)
  };

  static Constants<double> prepare(const EstimatorSetup& setup, const Settings& given) {
    const Circuit<double>& c = setup.circuit;
    const SettingReader setting{settings, given};
    const double L_m = c.magnetizing_inductance, L_r = L_m + c.rotor_leakage, L_s = L_m + c.stator_leakage;
    const double w = setup.nameplate.angular_frequency();
    Constants<double> k;
    k.period = setup.control_period_s;
    k.keep = 1.0 - low_pass_share(setting("drift_corner_Hz"), setup.control_period_s);
    k.speed_share = low_pass_share(setting("speed_filter_Hz"), setup.control_period_s);
    k.R_s = c.stator_resistance;
    k.R_slip = c.rotor_resistance * L_m / L_r;
    k.L_sigma = L_s - L_m * L_m / L_r;
    k.flux_ratio = L_r / L_m;
    k.torque_factor = 1.5 * c.pole_pairs * L_m / L_r;
    k.pole_pairs = c.pole_pairs;
    k.least_flux = 0.05 * setup.nameplate.phase_peak_V() / w;
    k.speed_limit = 3.0 * w;
    return k;
  }

  static State<double> begin(const EstimatorSetup& setup, const Constants<double>& k) {
    State<double> s;
    s.stator_flux = {setup.start_rotor_flux_Wb / k.flux_ratio, 0.0};
    s.speed = setup.start_speed_rad_s * k.pole_pairs;
    return s;
  }

  template <class Real>
  static Estimate<Real> step(State<Real>& s, const Sample<Real>& in, const Constants<Real>& k) {
    const Vec2<Real> u{in.u_alpha, in.u_beta}, i{in.i_alpha, in.i_beta};
    s.stator_flux = k.keep * s.stator_flux + k.period * (u - Real(0.5) * k.R_s * (i + s.current));
    const Vec2<Real> flux = k.flux_ratio * (s.stator_flux - k.L_sigma * i);
    const Real length = magnitude(flux), divisor = max(length, k.least_flux);
    const Real angle = wrap_angle(atan2(flux.y, flux.x));
    const Real w_s = wrap_angle(angle - s.angle) / k.period, slip = k.R_slip * cross(flux, i) / (divisor * divisor);
    const Real w_r = clamp(w_s - slip, -k.speed_limit, k.speed_limit);
    // Without flux there is no direction: the speed is held.
    s.speed = select(length > k.least_flux, s.speed + k.speed_share * (w_r - s.speed), s.speed);
    s.current = i;
    s.angle = angle;

    Estimate<Real> out;
    out.speed = s.speed / k.pole_pairs;
    out.rotor_flux = length;
    out.rotor_flux_angle = angle;
    out.torque = k.torque_factor * cross(flux, i);
    out.trust = select(length > k.least_flux, Real(1.0), Real(0.0));
    return out;
  }
};

}  // namespace slipbench::outside
