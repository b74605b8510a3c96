#include "sim/scenario/scenario.hpp"

#include <cmath>

namespace slipbench {

Circuit<double> MachineSettings::circuit() const {
  const auto pairs = static_cast<double>(pole_pairs);
  if (circuit_form == "inverse_gamma") {
    return from_inverse_gamma(pairs, stator_resistance_ohm, rotor_resistance_ohm, total_leakage_H,
                              magnetizing_inductance_H);
  }
  if (circuit_form == "gamma") {
    return from_gamma(pairs, stator_resistance_ohm, rotor_resistance_ohm, total_leakage_H, magnetizing_inductance_H);
  }
  return {pairs,           stator_resistance_ohm,   rotor_resistance_ohm, stator_leakage_H,
          rotor_leakage_H, magnetizing_inductance_H};
}

Nameplate MachineSettings::nameplate() const {
  Nameplate plate{rated_power_W,   rated_line_voltage_V, rated_current_A,    rated_frequency_Hz,
                  rated_speed_rpm, rated_torque_Nm,      rated_power_factor, rated_efficiency};
  if (plate.torque_Nm == 0.0) plate.torque_Nm = plate.power_W / plate.speed_rad_s();
  return plate;
}

Circuit<double> Scenario::believed_circuit() const {
  Circuit<double> c = belief.has_machine ? belief.machine.circuit() : machine.circuit();
  c.stator_resistance *= belief.stator_resistance;
  c.rotor_resistance *= belief.rotor_resistance;
  c.stator_leakage *= belief.stator_leakage;
  c.rotor_leakage *= belief.rotor_leakage;
  c.magnetizing_inductance *= belief.magnetizing_inductance;
  return c;
}

std::int64_t EventSettings::tick(double control_period_s) const {
  constexpr double rounding = 1e-5;  // of a tick: times of 1e10 ticks still carry it
  return static_cast<std::int64_t>(std::ceil(at_s / control_period_s - rounding));
}

}  // namespace slipbench
