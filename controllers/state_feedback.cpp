// Constants and first state of the state-feedback controller, and its step for the plain number types.
#include "controllers/state_feedback.hpp"

#include "controllers/state_feedback_design.hpp"
#include "plant/linear/gain_table.hpp"

namespace slipbench {
namespace {

StateCurrentConstants<double> current_of(const RotorFluxOriented::Constants<double>& base, const Settings& gains,
                                         bool integral) {
  const SettingTable &K = *gains.table("K"), &N = *gains.table("reference_gain");
  const SettingTable* K_integral = integral ? gains.table("K_integral") : nullptr;
  std::vector<std::array<double, scheduled_gains>> points(K.count);
  for (std::size_t n = 0; n < K.count; ++n) {
    for (std::size_t row = 0; row < 2; ++row) {
      for (std::size_t column = 0; column < K.columns; ++column)
        points[n][row * feedback_columns + column] = K(n, row, column);
      for (std::size_t column = 0; column < 2; ++column) {
        const std::size_t at = 2 * feedback_columns + 2 * row + column;
        points[n][at] = K_integral != nullptr ? (*K_integral)(n, row, column) : 0.0;
        points[n][at + 4] = N(n, row, column);
      }
    }
  }
  StateCurrentConstants<double> c;
  c.gains = make_schedule(linear::gain_speeds_rad_s(gains), points);
  c.integral_action = integral ? 1.0 : 0.0;
  c.back = K_integral != nullptr ? clamp((*K_integral)(0, 0, 0) / max(K(0, 0, 0), 1e-9), 0.0, 1.0) : 0.0;
  c.resistance = base.current.resistance, c.leakage = base.current.leakage;
  c.flux_ratio = base.current.flux_ratio, c.rotor_rate = base.current.rotor_rate;
  c.delay = base.current.delay;
  c.legs = base.current.legs;
  return c;
}

}  // namespace

StateFeedback::Constants<double> StateFeedback::prepare(const ControllerSetup& setup, const Settings& given) {
  const RotorFluxOriented::Constants<double> base = RotorFluxOriented::prepare(setup, given);
  const Settings gains = with_gains(setup, given);
  Constants<double> c;
  c.orientation = base.orientation, c.flux = base.flux, c.speed = base.speed;
  c.torque_per_ampere = base.torque_per_ampere;
  c.current = current_of(base, gains, given.value("integral_action", 1.0) > 0.5);
  c.observed = given.value("observer", 0.0);
  c.observer.model = current_flux_model(setup.circuit, setup.control_period_s);
  if (c.observed > 0.5) c.observer.gain = linear::observer_schedule(gains);
  return c;
}

StateFeedback::State<double> StateFeedback::begin(const ControllerSetup& setup, const Constants<double>& c) {
  State<double> s;
  const bool up = setup.start_rotor_flux_Wb > 0.0;
  // From rest the model starts with a thousandth of the flux: the alpha axis becomes d before the first noise is heard.
  s.orientation.rotor_flux = {up ? setup.start_rotor_flux_Wb : 1e-3 * c.flux.limit, 0.0};
  s.observer.x.flux = s.orientation.rotor_flux;
  s.observer.speed = c.orientation.pole_pairs * setup.start_speed_rad_s;
  s.flux.reference = up ? min(setup.start_rotor_flux_Wb, c.flux.limit) : c.flux.limit;
  s.flux.trim = 1.0;
  s.flux.magnetised = up ? 1.0 : 0.0;
  return s;
}

template Command<double> StateFeedback::step(State<double>&, const Measurement<double>&, const Constants<double>&);
template Command<float> StateFeedback::step(State<float>&, const Measurement<float>&, const Constants<float>&);

}  // namespace slipbench
