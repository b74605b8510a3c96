// Published machines as the tests use them; sources beside each.
#pragma once

#include <array>
#include <string>

#include "plant/parameters.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench::published {

struct Published {
  const char* name;
  Circuit<double> circuit;
  double inertia;  // kg m^2
  double line_voltage, frequency, speed_rpm;
  // Steady state of the circuit at this slip on rated supply, computed from the circuit in 60-digit arithmetic and by SciPy.
  double slip, current_rms, torque;
};

inline Circuit<double> from_reactances(double poles, double hz, double rs, double xls, double xm, double xlr,
                                       double rr) {
  const double w = 2.0 * 3.14159265358979323846 * hz;
  return {poles / 2.0, rs, rr, xls / w, xlr / w, xm / w};
}

// P.C. Krause, O. Wasynczuk, S.D. Sudhoff, "Analysis of Electric Machinery and Drive Systems", 2nd ed., 2002, Table 4.10-1
// (table number from memory).
inline Published krause_3hp() {
  return {
      "Krause 3 hp", from_reactances(4, 60, 0.435, 0.754, 26.13, 0.754, 0.816), 0.089, 220, 60, 1710, 0.05, 8.844811120,
      14.026832328};
}
inline Published krause_50hp() {
  return {"Krause 50 hp",
          from_reactances(4, 60, 0.087, 0.302, 13.08, 0.302, 0.228),
          1.662,
          460,
          60,
          1705,
          0.05277777777777778,
          62.804314729,
          234.640560612};
}
inline Published krause_500hp() {
  return {"Krause 500 hp",
          from_reactances(4, 60, 0.262, 1.206, 54.02, 1.206, 0.187),
          11.06,
          2300,
          60,
          1773,
          0.015,
          105.206151887,
          1999.352257267};
}
// M. Barut, S. Bogosyan, M. Gokasan, IEEE Trans. Ind. Electron. 54(1), 2007, 272-280 (from memory): Ls = Lr = 0.2311, Lm = 0.22 H.
inline Published barut_3kw() {
  return {
      "Barut 3 kW", {2.0, 2.283, 2.133, 0.0111, 0.0111, 0.22}, 0.0183, 380, 50, 1430, 0.04666666666666667, 5.368648641,
      16.329373958};
}
// M. Hinkkanen, IEEE Trans. Ind. Electron. 51(5), 2004, 1049-1055 (from memory): inverse-gamma circuit.
inline Published hinkkanen_2kw() {
  return {"Hinkkanen 2.2 kW",
          from_inverse_gamma(2.0, 3.67, 1.65, 0.0209, 0.264),
          0.0155,
          400,
          50,
          1430,
          0.04666666666666667,
          5.959753287,
          20.296154144};
}
// R. Krishnan, "Electric Motor Drives: Modeling, Analysis, and Control", 2001: Lm 0.0538, Ls 0.0553, Lr 0.05606 H.
inline Published krishnan_5hp() {
  return {"Krishnan 5 hp", {2.0, 0.277, 0.183, 0.0015, 0.00226, 0.0538}, 0.0165, 200, 60, 1746, 0.03, 18.697498471,
          28.855130622};
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
