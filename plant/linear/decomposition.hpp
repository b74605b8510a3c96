// Modal form, and Kalman's decomposition into four parts.
//
//   x = T z,  A_z = T^-1 A T,  B_z = T^-1 B,  C_z = C T
//
// Modal: A_z block diagonal, a real pole p as [p], a pair a +- j b as [a b; -b a], larger real part first. In balanced units
// the columns of T have unit length, and there its condition is taken. A defective matrix has no modal form: LinearError
// names the pole; nearly so (condition of T beyond 1e8: half the digits) is warned of.
//
// Kalman: states in the order controllable and observable (co), controllable only (c), observable only (o), neither (n):
//   A_z = [co 0 * 0; * c * *; 0 0 o 0; 0 0 * n],  B_z = [*; *; 0; 0],  C_z = [* 0 * 0]
// The zeros are written as exact zeros; `residual` says how large they were, relative to ||A||, ||B||, ||C||. T is as
// orthogonal as the subspaces allow. Source: R.E. Kalman, SIAM J. Control 1, 1963; D. Boley, BIT 24, 1984.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct Modal {
  System system;
  Matrix T;
  double condition = 1.0;
  std::string warning;
};
Modal modal_form(const System& system);

struct KalmanForm {
  System system;
  Matrix T;
  Vector unit;  // balanced units of the states: the subspaces were found for x / unit
  Eigen::Index controllable_observable = 0, controllable_only = 0, observable_only = 0, neither = 0;
  double tolerance = 0.0, residual = 0.0, condition = 1.0;
  std::string warning;
};
KalmanForm kalman_form(const System& system);

}  // namespace slipbench::linear
