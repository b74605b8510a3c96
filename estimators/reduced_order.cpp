#include "estimators/reduced_order.hpp"

namespace slipbench {

ReducedOrder::Constants<double> ReducedOrder::prepare(const EstimatorSetup& setup, const Settings& given) {
  const SettingReader setting{settings, given};
  Constants<double> c;
  c.machine = believe(setup);
  c.gain = flux_gain_for(setup, setting("flux_damping"), setting("flux_stiffness"), setting("flux_bandwidth_limit_Hz"));
  c.speed_share = low_pass_share(setting("speed_filter_Hz"), setup.control_period_s);
  c.frequency_share = low_pass_share(setting("frequency_filter_Hz"), setup.control_period_s);
  c.per_period = 1.0 / setup.control_period_s;
  return c;
}

ReducedOrder::State<double> ReducedOrder::begin(const EstimatorSetup& setup, const Constants<double>& c) {
  State<double> s;
  s.flux = {setup.start_rotor_flux_Wb / c.machine.per_flux_ratio, 0.0};
  s.speed = s.frequency = s.speed_between = s.frequency_between = setup.start_speed_rad_s * c.machine.pole_pairs;
  return s;
}

}  // namespace slipbench
