#include "estimators/believed_machine.hpp"

namespace slipbench {

double nominal_rotor_flux(const EstimatorSetup& setup) {
  // Inverse-gamma circuit at rated slip: psi_R carried by the phasor of the magnetising branch.
  const InverseGamma<double> c = to_inverse_gamma(setup.circuit);
  const double w = setup.nameplate.angular_frequency();
  const double slip_w = w - setup.nameplate.speed_rad_s() * c.pole_pairs;
  const double alpha = c.rotor_resistance / c.magnetizing_inductance;
  // i = psi (1 + j slip_w / alpha) / L_M and u = R_s i + j w (L_sigma i + psi), so |psi| = |u| / |R_s i + ...| per unit psi.
  const Vec2<double> i{1.0 / c.magnetizing_inductance, slip_w / (alpha * c.magnetizing_inductance)};
  const Vec2<double> stator_flux = c.leakage * i + Vec2<double>{1.0, 0.0};
  return setup.nameplate.phase_peak_V() / magnitude(c.stator_resistance * i + w * quarter_turn(stator_flux));
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

double SettingReader::operator()(std::string_view name) const {
  for (const Setting& row : table) {
    if (row.name == name) return given.value(name, row.fallback);
  }
  return derived;  // a name outside the table: a mistake that shows at once
}

double low_pass_share(double corner_Hz, double period_s) { return 1.0 - exp(-rad_per_turn * corner_Hz * period_s); }

}  // namespace slipbench
