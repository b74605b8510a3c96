// Published machines the estimators are tried on.
#pragma once

#include <array>
#include <string_view>

#include "estimators/method.hpp"
#include "tests/published/circuits.hpp"

namespace slipbench::tests {

struct PublishedMachine {
  std::string_view name;
  Circuit<double> circuit;
  Nameplate plate;
  double inertia;
};

inline PublishedMachine machine(std::string_view name, const published::PublishedCircuit& c, const Nameplate& plate) {
  return {name, c.circuit, plate, c.inertia};
}
// Ratings as printed; the torque of the 3 hp machine is power over speed, speed and current of the 5 hp one are at the slip
// that gives its power.
inline PublishedMachine krause_3hp() {
  return machine("Krause 3 hp", published::krause_3hp_circuit(), {2238, 220, 5.8, 60, 1710, 12.5});
}
inline PublishedMachine barut_3kW() {
  return machine("Barut 3 kW", published::barut_3kw_circuit(), {3000, 380, 6.9, 50, 1430, 20});
}
inline PublishedMachine hinkkanen_2kW() {
  return machine("Hinkkanen 2.2 kW", published::hinkkanen_2kw_circuit(), {2200, 400, 5.0, 50, 1430, 14.6});
}
inline PublishedMachine krishnan_5hp() {
  return machine("Krishnan 5 hp", published::krishnan_5hp_circuit(), {3730, 200, 14, 60, 1760, 20.2});
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
