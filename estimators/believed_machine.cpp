#include "estimators/believed_machine.hpp"

#include "plant/steady_state.hpp"

namespace slipbench {

double nominal_rotor_flux(const EstimatorSetup& setup) {
  return to_inverse_gamma(setup.circuit).flux_ratio * rated_rotor_flux(setup.circuit, setup.nameplate);
}

BelievedMachine<double> believe(const EstimatorSetup& setup) {
  const InverseGamma<double> c = to_inverse_gamma(setup.circuit);
  const double flux = nominal_rotor_flux(setup);
  BelievedMachine<double> m;
  m.pole_pairs = c.pole_pairs;
  m.R_s = c.stator_resistance;
  m.R_R = c.rotor_resistance;
  m.alpha = c.rotor_resistance / c.magnetizing_inductance;
  m.L_sigma = c.leakage;
  m.per_L_sigma = 1.0 / c.leakage;
  m.torque_factor = 1.5 * c.pole_pairs;
  m.per_flux_ratio = 1.0 / c.flux_ratio;
  m.period = setup.control_period_s;
  m.least_flux = 0.05 * flux;
  m.per_nominal_flux = 1.0 / flux;
  m.speed_limit = 3.0 * setup.nameplate.angular_frequency();
  return m;
}

FluxGain<double> flux_gain_for(const EstimatorSetup& setup, double damping, double stiffness, double frequency_cap_Hz) {
  constexpr double sign_width_Hz = 0.2;
  const BelievedMachine<double> m = believe(setup);
  // Four times rated slip covers 1.5 times rated torque at flux weakened to two thirds; six times alpha where
  // the plate gives hardly any slip.
  const Nameplate& plate = setup.nameplate;
  const double rated_slip = plate.angular_frequency() - m.pole_pairs * plate.speed_rad_s();
  FluxGain<double> k;
  k.alpha = k.floor = m.alpha;
  k.twice_damping = 2.0 * damping;
  k.frequency_cap = rad_per_turn * frequency_cap_Hz;
  k.stiffness = stiffness * m.alpha;
  k.sign_width = rad_per_turn * sign_width_Hz;
  k.most_slip = max(4.0 * rated_slip, 6.0 * m.alpha);
  k.per_half_flux = 2.0 * m.per_nominal_flux;
  return k;
}

double SettingReader::operator()(std::string_view name) const {
  for (const Setting& row : table) {
    if (row.name == name) return given.value(name, row.fallback);
  }
  return derived;  // a name outside the table: a mistake that shows at once
}

double low_pass_share(double corner_Hz, double period_s) { return 1.0 - exp(-rad_per_turn * corner_Hz * period_s); }

}  // namespace slipbench
