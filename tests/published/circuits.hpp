// Circuits of the published machines, once for all tests: per phase, star, rotor referred to the stator; inertia kg m^2. What a
// nameplate says differs from what a circuit gives, so each test states the ratings it uses.
#pragma once

#include "plant/parameters.hpp"

namespace slipbench::published {

struct PublishedCircuit {
  Circuit<double> circuit;
  double inertia;
};

inline Circuit<double> from_reactances(double poles, double hz, double rs, double xls, double xm, double xlr,
                                       double rr) {
  const double w = 2.0 * 3.14159265358979323846 * hz;
  return {poles / 2.0, rs, rr, xls / w, xlr / w, xm / w};
}

// P.C. Krause, O. Wasynczuk, S.D. Sudhoff, "Analysis of Electric Machinery and Drive Systems", 2nd ed., 2002, Table 4.10-1
// (table number from memory); reactances at 60 Hz.
inline PublishedCircuit krause_3hp_circuit() {
  return {from_reactances(4, 60, 0.435, 0.754, 26.13, 0.754, 0.816), 0.089};
}
inline PublishedCircuit krause_50hp_circuit() {
  return {from_reactances(4, 60, 0.087, 0.302, 13.08, 0.302, 0.228), 1.662};
}
inline PublishedCircuit krause_500hp_circuit() {
  return {from_reactances(4, 60, 0.262, 1.206, 54.02, 1.206, 0.187), 11.06};
}
// M. Barut, S. Bogosyan, M. Gokasan, IEEE Trans. Ind. Electron. 54(1), 2007, 272-280 (from memory): L_s = L_r = 0.2311 H,
// L_m = 0.22 H.
inline PublishedCircuit barut_3kw_circuit() { return {{2.0, 2.283, 2.133, 0.0111, 0.0111, 0.22}, 0.0183}; }
// M. Hinkkanen, IEEE Trans. Ind. Electron. 51(5), 2004, 1049-1055 (from memory): inverse-gamma circuit.
inline PublishedCircuit hinkkanen_2kw_circuit() { return {from_inverse_gamma(2.0, 3.67, 1.65, 0.0209, 0.264), 0.0155}; }
// R. Krishnan, "Electric Motor Drives: Modeling, Analysis, and Control", 2001, ch. 5 and 8: L_m 0.0538, L_s 0.0553,
// L_r 0.05606 H.
inline PublishedCircuit krishnan_5hp_circuit() { return {{2.0, 0.277, 0.183, 0.0015, 0.00226, 0.0538}, 0.0165}; }

}  // namespace slipbench::published
