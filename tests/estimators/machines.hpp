// Published machines the estimators are tried on. Circuits per phase, star, rotor referred to the stator.
#pragma once

#include <array>
#include <string_view>

#include "estimators/method.hpp"

namespace slipbench::tests {

struct PublishedMachine {
  std::string_view name;
  Circuit<double> circuit;
  Nameplate plate;
  double inertia;
};

// P.C. Krause, O. Wasynczuk, S.D. Sudhoff, "Analysis of Electric Machinery and Drive Systems", 2nd ed. 2002,
// Table 4.10-1: 3 hp, 220 V, 60 Hz, 4 poles, 1710 rpm; reactances at 60 Hz. Torque here is power over speed.
inline PublishedMachine krause_3hp() {
  constexpr double w = 376.99111843077518862;
  return {"Krause 3 hp", {2, 0.435, 0.816, 0.754 / w, 0.754 / w, 26.13 / w}, {2238, 220, 5.8, 60, 1710, 12.5}, 0.089};
}
// M. Barut, S. Bogosyan, M. Gokasan, IEEE Trans. Ind. Electron. 54(1), 2007, 272-280 (from memory).
inline PublishedMachine barut_3kW() {
  return {"Barut 3 kW", {2, 2.283, 2.133, 0.0111, 0.0111, 0.22}, {3000, 380, 6.9, 50, 1430, 20}, 0.0183};
}
// M. Hinkkanen, IEEE Trans. Ind. Electron. 51(5), 2004, 1049-1055 (from memory): inverse-gamma circuit.
inline PublishedMachine hinkkanen_2kW() {
  return {
      "Hinkkanen 2.2 kW", from_inverse_gamma(2, 3.67, 1.65, 0.0209, 0.264), {2200, 400, 5.0, 50, 1430, 14.6}, 0.0155};
}
// R. Krishnan, "Electric Motor Drives: Modeling, Analysis, and Control", 2001, ch. 5 and 8 examples. Speed
// and current at the circuit's slip for 5 hp are this file's.
inline PublishedMachine krishnan_5hp() {
  return {"Krishnan 5 hp", {2, 0.277, 0.183, 0.0015, 0.00226, 0.0538}, {3730, 200, 14, 60, 1760, 20.2}, 0.0165};
}
inline std::array<PublishedMachine, 4> published_machines() {
  return {krause_3hp(), barut_3kW(), hinkkanen_2kW(), krishnan_5hp()};
}

inline EstimatorSetup setup_of(const PublishedMachine& m) {
  EstimatorSetup s;
  s.circuit = m.circuit;
  s.nameplate = m.plate;
  s.inertia_kgm2 = m.inertia;
  s.current_noise_A = 0.01 * m.plate.peak_current_A();
  return s;
}

}  // namespace slipbench::tests
