// Published machines on their rated supply, and a mains run of one; sources of the circuits in circuits.hpp.
#pragma once

#include <array>
#include <string>

#include "sim/scenario/scenario.hpp"
#include "tests/published/circuits.hpp"

namespace slipbench::published {

struct Published {
  const char* name;
  Circuit<double> circuit;
  double inertia;  // kg m^2
  double line_voltage, frequency, speed_rpm;
  // Steady state of the circuit at this slip on rated supply, computed from the circuit in 60-digit arithmetic and by SciPy.
  double slip, current_rms, torque;
};

inline Published published(const char* name, const PublishedCircuit& c, double line_voltage, double frequency,
                           double speed_rpm, double slip, double current_rms, double torque) {
  return {name, c.circuit, c.inertia, line_voltage, frequency, speed_rpm, slip, current_rms, torque};
}
inline Published krause_3hp() {
  return published("Krause 3 hp", krause_3hp_circuit(), 220, 60, 1710, 0.05, 8.844811120, 14.026832328);
}
inline Published krause_50hp() {
  return published("Krause 50 hp", krause_50hp_circuit(), 460, 60, 1705, 0.05277777777777778, 62.804314729,
                   234.640560612);
}
inline Published krause_500hp() {
  return published("Krause 500 hp", krause_500hp_circuit(), 2300, 60, 1773, 0.015, 105.206151887, 1999.352257267);
}
inline Published barut_3kw() {
  return published("Barut 3 kW", barut_3kw_circuit(), 380, 50, 1430, 0.04666666666666667, 5.368648641, 16.329373958);
}
inline Published hinkkanen_2kw() {
  return published("Hinkkanen 2.2 kW", hinkkanen_2kw_circuit(), 400, 50, 1430, 0.04666666666666667, 5.959753287,
                   20.296154144);
}
inline Published krishnan_5hp() {
  return published("Krishnan 5 hp", krishnan_5hp_circuit(), 200, 60, 1746, 0.03, 18.697498471, 28.855130622);
}
inline std::array<Published, 4> four() { return {krause_3hp(), krause_50hp(), barut_3kw(), krishnan_5hp()}; }

// A mains run of a published machine: no friction, no load, rk4.
inline Scenario on_mains(const Published& p, double duration_s, double step_s) {
  Scenario s;
  s.title = p.name;
  s.run.duration_s = duration_s;
  s.run.plant_step_s = s.run.control_period_s = step_s;
  s.run.trace_period_s = 1e-3;
  s.machine.pole_pairs = static_cast<std::int64_t>(p.circuit.pole_pairs);
  s.machine.stator_resistance_ohm = p.circuit.stator_resistance;
  s.machine.rotor_resistance_ohm = p.circuit.rotor_resistance;
  s.machine.stator_leakage_H = p.circuit.stator_leakage;
  s.machine.rotor_leakage_H = p.circuit.rotor_leakage;
  s.machine.magnetizing_inductance_H = p.circuit.magnetizing_inductance;
  s.machine.rated_line_voltage_V = p.line_voltage;
  s.machine.rated_frequency_Hz = p.frequency;
  s.machine.rated_speed_rpm = p.speed_rpm;
  s.machine.rated_torque_Nm = p.torque;
  s.machine.rated_current_A = p.current_rms;
  s.machine.rated_power_W = p.torque * p.speed_rpm * 3.14159265358979323846 / 30.0;
  s.shaft.inertia_kgm2 = p.inertia;
  s.supply.kind = "mains";
  s.supply.line_voltage_V = p.line_voltage;
  s.supply.frequency_Hz = p.frequency;
  s.score.to_s = duration_s;
  return s;
}

}  // namespace slipbench::published
