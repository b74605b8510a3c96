#include "estimators/luenberger.hpp"

namespace slipbench {

Luenberger::Constants<double> Luenberger::prepare(const EstimatorSetup& setup, const Settings& given) {
  const SettingReader setting{settings, given};
  Constants<double> c;
  c.machine = believe(setup);
  const double adaptation_Hz = setting("adaptation_bandwidth_Hz"), a_w = rad_per_turn * adaptation_Hz;
  c.gain = flux_gain_for(setup, setting("flux_damping"), setting("flux_stiffness"), setting("flux_bandwidth_limit_Hz"));
  c.current_share = low_pass_share(4.0 * adaptation_Hz, setup.control_period_s);
  c.flux_share = c.current_share * c.machine.L_sigma;
  c.adaptation = a_w * c.flux_share;
  c.frequency_share = low_pass_share(setting("frequency_filter_Hz"), setup.control_period_s);
  c.per_period = 1.0 / setup.control_period_s;
  return c;
}

Luenberger::State<double> Luenberger::begin(const EstimatorSetup& setup, const Constants<double>& c) {
  State<double> s;
  s.x.flux = {setup.start_rotor_flux_Wb / c.machine.per_flux_ratio, 0.0};
  s.speed = s.frequency = s.frequency_between = setup.start_speed_rad_s * c.machine.pole_pairs;
  return s;
}

}  // namespace slipbench
