#include "plant/steady_state.hpp"

namespace slipbench {

namespace {

Vec2<double> quotient(const Vec2<double>& a, const Vec2<double>& b) {
  return (1.0 / (b.x * b.x + b.y * b.y)) * seen_from(b, a);
}

}  // namespace

SteadyState steady_at_slip(const Circuit<double>& c, double phase_peak_V, double w, double slip) {
  const double L_s = c.stator_inductance(), L_r = c.rotor_inductance(), L_m = c.magnetizing_inductance;
  const Vec2<double> rotor{c.rotor_resistance, slip * w * L_r};
  const Vec2<double> reflected = quotient({slip * w * w * L_m * L_m, 0.0}, rotor);
  SteadyState s;
  s.voltage = {phase_peak_V, 0.0};
  s.current = quotient(s.voltage, Vec2<double>{c.stator_resistance, w * L_s} + reflected);
  const Vec2<double> i_r = product(quotient({0.0, -slip * w * L_m}, rotor), s.current);
  s.flux.stator = L_s * s.current + L_m * i_r;
  s.flux.rotor = L_r * i_r + L_m * s.current;
  s.torque = 1.5 * c.pole_pairs * cross(s.flux.stator, s.current);
  s.stator_frequency = w;
  s.slip_frequency = slip * w;
  s.electrical_speed = (1.0 - slip) * w;
  return s;
}

double pull_out_slip(const Circuit<double>& c, double w) {
  // s_k = R_r / sqrt(R_th^2 + (X_th + X_r)^2) with the Thevenin impedance seen from the rotor branch.
  const double X_s = w * c.stator_inductance(), X_m = w * c.magnetizing_inductance;
  const Vec2<double> source =
      quotient(product<double>({0.0, X_m}, {c.stator_resistance, X_s - X_m}), Vec2<double>{c.stator_resistance, X_s});
  const double X = source.y + w * c.rotor_leakage;
  return c.rotor_resistance / sqrt(source.x * source.x + X * X);
}

std::optional<double> stable_slip(const Circuit<double>& c, double phase_peak_V, double w,
                                  const std::function<double(double)>& demand) {
  const auto surplus = [&](double slip) {
    return steady_at_slip(c, phase_peak_V, w, slip).torque - demand((1.0 - slip) * w / c.pole_pairs);
  };
  double high = pull_out_slip(c, w), low = -high;
  if (surplus(low) > 0.0 || surplus(high) < 0.0) return {};
  // Torque rises with slip between the two pull-outs: bisect until the interval no longer shrinks.
  for (;;) {
    const double middle = 0.5 * (low + high);
    if (middle <= low || middle >= high) return middle;
    (surplus(middle) < 0.0 ? low : high) = middle;
  }
}

double rated_rotor_flux(const Circuit<double>& c, const Nameplate& plate) {
  const double w = plate.angular_frequency(), slip = 1.0 - c.pole_pairs * plate.speed_rad_s() / w;
  return magnitude(steady_at_slip(c, plate.phase_peak_V(), w, slip).flux.rotor);
}

SteadyState steady_at_flux(const Circuit<double>& c, double rotor_flux, double torque, double electrical_speed) {
  const double L_r = c.rotor_inductance(), L_m = c.magnetizing_inductance, L_s = c.stator_inductance();
  SteadyState s;
  s.torque = torque;
  s.electrical_speed = electrical_speed;
  s.current = {rotor_flux / L_m, torque * L_r / (1.5 * c.pole_pairs * L_m * rotor_flux)};
  s.slip_frequency = c.rotor_resistance * L_m * s.current.y / (L_r * rotor_flux);
  s.stator_frequency = electrical_speed + s.slip_frequency;
  s.flux.rotor = {rotor_flux, 0.0};
  s.flux.stator = (L_s - L_m * L_m / L_r) * s.current + (L_m / L_r) * s.flux.rotor;
  s.voltage = c.stator_resistance * s.current + s.stator_frequency * quarter_turn(s.flux.stator);
  return s;
}

}  // namespace slipbench
