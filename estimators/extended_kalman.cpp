#include "estimators/extended_kalman.hpp"

namespace slipbench {

ExtendedKalman::Constants<double> ExtendedKalman::prepare(const EstimatorSetup& setup, const Settings& given) {
  const SettingReader setting{settings, given};
  const Nameplate& plate = setup.nameplate;
  Constants<double> c;
  c.model.machine = believe(setup);
  const BelievedMachine<double>& m = c.model.machine;
  const double T = setup.control_period_s, p = m.pole_pairs, flux = 1.0 / m.per_nominal_flux;
  const double rated_speed = plate.angular_frequency() / p;
  const double rated_torque = plate.torque_Nm > 0.0 ? plate.torque_Nm : plate.power_W / rated_speed;
  const double inertia = setting("inertia_kgm2", setup.inertia_kgm2);
  const bool shaft = setting("load_torque") > 0.5;

  if (shaft) {
    c.model.speed_per_torque = T * p / inertia;
    c.model.damping = T * setup.viscous_friction_Nms / inertia;
  }
  // Walks are given over 1 s: their variance grows by T of that a period.
  const auto walk = [&](double rms_over_1_s) { return rms_over_1_s * rms_over_1_s * T; };
  const double voltage = setting("process_voltage_V", 0.005 * plate.phase_peak_V());
  const double current = setting("process_current_A", T * m.per_L_sigma * voltage);
  const double flux_step = setting("process_flux_Wb", 0.02 * sqrt(T) * flux * m.per_flux_ratio) / m.per_flux_ratio;
  const double speed = setting("process_speed_rad_s", 0.1 * rated_speed);
  const double load = setting("process_load_torque_Nm", 2.0 * rated_torque);
  c.process = {square(current),   square(current),     square(flux_step),
               square(flux_step), p * p * walk(speed), shaft ? walk(load) : 0.0};

  const double least_noise = 1e-3 * plate.peak_current_A();
  const double noise = setting("measured_current_noise_A", max(setup.current_noise_A, least_noise)), s2 = noise * noise;
  if (setup.current_sensors == 2) {
    c.noise_diagonal = {s2, 5.0 / 3.0 * s2};
    c.noise_cross = s2 / 1.73205080756887729353;
  } else {
    c.noise_diagonal = {2.0 / 3.0 * s2, 2.0 / 3.0 * s2};
  }
  c.most = {square(2.0 * plate.angular_frequency()), square(10.0 * rated_torque)};
  c.per_doubt = 1.0 / square(0.02 * plate.angular_frequency());
  c.surprise_share = low_pass_share(surprise_filter_Hz, T);
  c.lost_speed = 2.5 * plate.angular_frequency();
  c.start_deviation = {setting("initial_current_A", 0.1 * plate.peak_current_A()),
                       setting("initial_flux_Wb", 0.02 * flux * m.per_flux_ratio) / m.per_flux_ratio,
                       p * setting("initial_speed_rad_s", 0.02 * rated_speed),
                       shaft ? setting("initial_load_torque_Nm", rated_torque) : 0.0};
  return c;
}

ExtendedKalman::State<double> ExtendedKalman::begin(const EstimatorSetup& setup, const Constants<double>& c) {
  State<double> s;
  s.x.flux = {setup.start_rotor_flux_Wb / c.model.machine.per_flux_ratio, 0.0};
  s.x.speed = setup.start_speed_rad_s * c.model.machine.pole_pairs;
  for (std::size_t n = 0; n < 6; ++n) s.P.set(n, n, square(c.start_deviation[start_kind[n]]));
  return s;
}

}  // namespace slipbench
