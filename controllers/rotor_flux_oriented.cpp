// Gains and first state of the rotor-flux-oriented controller, and its step for the plain number types.
#include "controllers/rotor_flux_oriented.hpp"

#include <stdexcept>

namespace slipbench {
namespace {

constexpr double two_pi = 6.28318530717958647692;

// Phases of the symmetric optimum, see speed_control.hpp.
constexpr double widest = 4.0, narrowest = 2.0;

OrientationConstants<double> orientation_of(const ControllerSetup& setup) {
  const Circuit<double>& circuit = setup.circuit;
  const double T = setup.control_period_s, L_m = circuit.magnetizing_inductance;
  const double tau_r = circuit.rotor_inductance() / circuit.rotor_resistance;
  const double leakage = to_inverse_gamma(circuit).leakage;
  OrientationConstants<double> c;
  c.keep = exp(-T / tau_r);
  c.now = L_m * (1.0 - (1.0 - c.keep) * tau_r / T);
  c.before = L_m * (1.0 - c.keep) - c.now;
  c.bow = L_m * (1.0 - c.keep) * T * T / (12.0 * leakage);
  c.pole_pairs = circuit.pole_pairs;
  c.half_turn_time = 0.5 * circuit.pole_pairs * T;
  c.slip_gain = L_m / tau_r;
  c.flux_floor = 0.1 * setup.rotor_flux_reference_Wb;
  c.direct = setup.direct_orientation ? 1.0 : 0.0;
  return c;
}

FluxConstants<double> flux_of(const ControllerSetup& setup, const Settings& given, double alpha_c) {
  const Circuit<double>& circuit = setup.circuit;
  const double tau_r = circuit.rotor_inductance() / circuit.rotor_resistance;
  const double alpha_flux = two_pi * given.value("flux_bandwidth_Hz", min(5.0 / tau_r, alpha_c / 20.0) / two_pi);
  FluxConstants<double> c;
  c.limit = setup.rotor_flux_reference_Wb;
  c.margin = given.value("voltage_margin", 0.92);
  c.R_s = circuit.stator_resistance;
  c.L_s = circuit.stator_inductance();
  c.leakage = to_inverse_gamma(circuit).leakage;
  c.L_m = circuit.magnetizing_inductance;
  c.flux_ratio = c.L_m / circuit.rotor_inductance();
  // A tenth of the current loop's bandwidth: smooth against noise in speed and slip, quick against any acceleration.
  c.filter = 1.0 - exp(-0.1 * alpha_c * setup.control_period_s);
  c.flux_gain = tau_r * alpha_flux;
  c.trim_rate = 0.25 * alpha_flux * setup.control_period_s;
  c.least_i_d = -c.limit / c.L_m;
  c.current_limit = given.value("current_limit_peak_A", 2.0 * setup.nameplate.peak_current_A());
  c.frequency_floor = 0.01 * setup.nameplate.angular_frequency();
  c.magnetised_share = given.value("magnetised_share", 0.95);
  return c;
}

SpeedConstants<double> speed_of(const ControllerSetup& setup, const Settings& given, double alpha_c, double advance) {
  const double T = setup.control_period_s, J = setup.inertia_kgm2;
  const double lag = given.value("speed_lag_s", setup.sensorless ? 4e-3 : 1e-3);
  const double T_sum = 1.0 / alpha_c + advance + lag;
  const double w_c = two_pi * given.value("speed_bandwidth_Hz", 1.0 / (widest * T_sum) / two_pi);
  const double a = clamp(1.0 / (w_c * T_sum), narrowest, widest), T_i = a / w_c;
  SpeedConstants<double> c;
  c.k_p = J * w_c;
  c.k_i_period = c.k_p * T / T_i;
  c.back = T / T_i;
  c.reference_share = min(0.5 * w_c * T, 1.0);  // T_f = 2 / w_c: the loop follows the shaped reference closely
  c.inertia_rate = J / T;
  c.per_inertia_rate = T / J;
  c.enabled = setup.speed_control ? 1.0 : 0.0;
  return c;
}

CurrentConstants<double> current_of(const ControllerSetup& setup, double alpha_c) {
  const InverseGamma<double> g = to_inverse_gamma(setup.circuit);
  const double T = setup.control_period_s;
  CurrentConstants<double> c;
  c.resistance = g.stator_resistance + g.rotor_resistance;
  c.leakage = g.leakage;
  c.k_p = alpha_c * c.leakage;
  c.k_i_period = alpha_c * c.resistance * T;
  c.back = c.resistance * T / c.leakage;
  c.flux_ratio = g.flux_ratio;
  c.rotor_rate = setup.circuit.rotor_resistance / setup.circuit.rotor_inductance();
  c.delay = setup.delay_periods;
  c.legs = legs_of(setup);
  return c;
}

void require(bool good, const char* what) {
  if (!good) throw std::invalid_argument(what);
}

}  // namespace

double RotorFluxOriented::current_bandwidth(const ControllerSetup& setup, const Settings& given) {
  const double advance = (setup.delay_periods + 0.5) * setup.control_period_s;
  return two_pi * given.value("current_bandwidth_Hz", min(0.06 / advance, 500.0));
}

RotorFluxOriented::Constants<double> RotorFluxOriented::prepare(const ControllerSetup& setup, const Settings& given) {
  require(setup.delay_periods >= 0 && setup.delay_periods <= 2, "delay_periods: 0, 1 or 2 allowed");
  require(setup.rotor_flux_reference_Wb > 0.0, "rotor flux reference must be above zero");
  require(setup.control_period_s > 0.0, "control period must be above zero");
  require(setup.inertia_kgm2 > 0.0, "inertia must be above zero");
  const double advance = (setup.delay_periods + 0.5) * setup.control_period_s;
  const double alpha_c = current_bandwidth(setup, given);
  Constants<double> c;
  c.orientation = orientation_of(setup);
  c.flux = flux_of(setup, given, alpha_c);
  c.speed = speed_of(setup, given, alpha_c, advance);
  c.current = current_of(setup, alpha_c);
  c.torque_per_ampere = 1.5 * c.orientation.pole_pairs * c.current.flux_ratio;
  require(c.flux.current_limit > 1.05 * c.flux.limit / c.flux.L_m,
          "current_limit_peak_A: less than 1.05 of the magnetising current of the flux reference");
  return c;
}

RotorFluxOriented::State<double> RotorFluxOriented::begin(const ControllerSetup& setup, const Constants<double>& c) {
  const bool up = setup.start_rotor_flux_Wb > 0.0;
  State<double> s;
  // From rest the model starts with a thousandth of the flux: the alpha axis becomes d before the first noise is heard.
  s.orientation.rotor_flux = {up ? setup.start_rotor_flux_Wb : 1e-3 * c.flux.limit, 0.0};
  s.flux.reference = up ? min(setup.start_rotor_flux_Wb, c.flux.limit) : c.flux.limit;
  s.flux.trim = 1.0;
  s.flux.magnetised = up ? 1.0 : 0.0;
  return s;
}

double RotorFluxOriented::steady_rotor_flux(const Constants<double>& c, double dc_link_V, double speed_rad_s,
                                            double torque_Nm) {
  const double limit = voltage_limit(c.current, dc_link_V);
  double flux = c.flux.limit;
  // Below pull-out each round brings the flux nearer by the square of L_sigma i_q / (L_s i_d), less than one.
  for (int round = 0; round < 400; ++round) {
    const Vec2<double> current{flux / c.flux.L_m, torque_Nm / (c.torque_per_ampere * flux)};
    const double w_s = c.orientation.pole_pairs * speed_rad_s + c.orientation.slip_gain * current.y / flux;
    flux = max(allowed_flux(c.flux, limit, w_s, current, 1.0), c.orientation.flux_floor);
  }
  return flux;
}

template Command<double> RotorFluxOriented::step(State<double>&, const Measurement<double>&, const Constants<double>&);
template Command<float> RotorFluxOriented::step(State<float>&, const Measurement<float>&, const Constants<float>&);

}  // namespace slipbench
