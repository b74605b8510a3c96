// Gains and first state of voltage/frequency control, and its step for the plain number types.
#include "controllers/volts_per_hertz.hpp"

#include <stdexcept>

namespace slipbench {
namespace {

constexpr double two_pi = 6.28318530717958647692;

void require(bool good, const char* what) {
  if (!good) throw std::invalid_argument(what);
}

double share_per_period(double period_s, double time_constant_s) { return 1.0 - exp(-period_s / time_constant_s); }

MagnetiseConstants<double> magnetise_of(const ControllerSetup& setup, double current_limit) {
  const Circuit<double>& circuit = setup.circuit;
  const double T = setup.control_period_s, tau_r = circuit.rotor_inductance() / circuit.rotor_resistance;
  // A quarter of the current loop's usual bandwidth: the flux behind it is a hundred times slower.
  const double alpha = 0.25 * two_pi * min(0.06 / ((setup.delay_periods + 0.5) * T), 500.0);
  MagnetiseConstants<double> c;
  c.flux = setup.rotor_flux_reference_Wb;
  c.push = 5.0;  // as much as flux loops usually have
  c.L_m = circuit.magnetizing_inductance;
  c.approach = share_per_period(T, tau_r);
  c.limit = current_limit;
  c.R_s = circuit.stator_resistance;
  c.k_p = alpha * to_inverse_gamma(circuit).leakage;
  c.k_i_period = alpha * c.R_s * T;
  c.enough = 0.95;
  return c;
}

}  // namespace

VoltsPerHertz::Constants<double> VoltsPerHertz::prepare(const ControllerSetup& setup, const Settings& given) {
  require(setup.delay_periods >= 0 && setup.delay_periods <= 2, "delay_periods: 0, 1 or 2 allowed");
  require(setup.rotor_flux_reference_Wb > 0.0, "rotor flux reference must be above zero");
  require(setup.control_period_s > 0.0, "control period must be above zero");
  require(setup.inertia_kgm2 > 0.0, "inertia must be above zero");
  require(setup.speed_control, "a torque reference: volts_per_hertz follows a speed");
  const Circuit<double>& circuit = setup.circuit;
  const Nameplate& plate = setup.nameplate;
  const double T = setup.control_period_s, p = circuit.pole_pairs, J = setup.inertia_kgm2;
  const double L_s = circuit.stator_inductance(), b = given.value("ir_boost", 1.0);

  Constants<double> c;
  c.load = held_flux_of(circuit);
  c.flux = setup.rotor_flux_reference_Wb * L_s / circuit.magnetizing_inductance;
  c.flux_ratio = circuit.magnetizing_inductance / L_s;
  c.boost = b * circuit.stator_resistance;
  c.missing_boost = (1.0 - b) * circuit.stator_resistance;
  c.least_flux = 0.05 * c.flux;
  c.frequency_floor = 0.02 * plate.angular_frequency();
  c.period = T;
  c.leakage = to_inverse_gamma(circuit).leakage;
  c.rotor_share = circuit.magnetizing_inductance / circuit.rotor_inductance();
  c.start_flux = setup.start_rotor_flux_Wb;
  c.start_frequency = c.start_flux > 0.0 ? p * setup.start_speed_rad_s : 0.0;

  const double rated_slip = load_point(c.load, plate.torque_Nm, square(c.flux)).slip;
  const double slip_per_ampere = rated_slip / (plate.torque_Nm / (c.load.torque_per_flux_current * c.flux));
  const double shaft_time = J * rated_slip / (p * plate.torque_Nm);
  c.slip_share = given.value("slip_compensation", 1.0);
  c.damping = given.value("damping", 1.0) * slip_per_ampere;
  c.most_damping = 2.0 * rated_slip;
  c.filter = share_per_period(T, given.value("current_filter_s", 0.02));
  c.slow_filter = share_per_period(T, 0.1);
  c.slip_filter = share_per_period(T, given.value("slip_filter_s", max(0.1, 4.0 * shaft_time)));

  const double ramp = given.value("frequency_ramp_Hz_per_s", 0.5 * plate.torque_Nm / J * p / two_pi);
  c.ramp.pole_pairs = p;
  // Current follows slip with sigma tau_r: what rises faster cannot be stopped in time.
  c.ramp.most_step = min(two_pi * ramp, 0.5 * rated_slip * c.load.per_sigma_tau) * T;
  c.ramp.limit = given.value("current_limit_peak_A", 2.0 * plate.peak_current_A());
  c.ramp.per_fifth = 5.0 / c.ramp.limit;
  c.ramp.slip_per_ampere = slip_per_ampere;
  c.ramp.give_way = 100.0 * T;
  c.ramp.at_once = min(8.0, 0.3 / (c.load.per_sigma_tau * (setup.delay_periods + 0.5) * T));
  c.magnetise = magnetise_of(setup, c.ramp.limit);
  c.legs = legs_of(setup);
  require(c.ramp.limit > 1.05 * c.flux / L_s,
          "current_limit_peak_A: less than 1.05 of the magnetising current of the flux reference");
  return c;
}

VoltsPerHertz::State<double> VoltsPerHertz::begin(const ControllerSetup& setup, const Constants<double>& c) {
  State<double> s;
  s.frequency = s.stator_frequency = c.start_frequency;
  s.flux = c.flux;
  s.i_x_per_flux = c.load.per_inductance;
  s.magnetise.flux = setup.start_rotor_flux_Wb;
  s.magnetise.done = c.start_frequency != 0.0 ? 1.0 : 0.0;
  return s;
}

template Command<double> VoltsPerHertz::step(State<double>&, const Measurement<double>&, const Constants<double>&);
template Command<float> VoltsPerHertz::step(State<float>&, const Measurement<float>&, const Constants<float>&);

}  // namespace slipbench
