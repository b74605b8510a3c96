// Linear-quadratic regulator: the state feedback u = -K x of least cost, continuous or discrete, with cross term; and with
// integral action.
//
//   continuous  J = integral x'Q x + 2 x'N u + u'R u dt        discrete  J = sum x'Q x + 2 x'N u + u'R u
//
// Q n x n, R m x m, N n x m (empty: zero), all in the caller's units. Q may be indefinite where a stabilising solution exists.
// LinearError: shapes; R not positive definite (discrete: not positive semidefinite), naming its eigenvalue; a mode that can't be
// stabilised, named; a mode on the stability limit that the weight does not see, named.
// Integral action: the plant is augmented by z' = r - y (discrete z[k+1] = z[k] + T (r[k] - y[k])), one state an output, and
// u = -[K_x K_z] [x; z]. Refused where the plant has more outputs than inputs or a zero at s = 0 (z = 1).
// Source: B.D.O. Anderson, J.B. Moore, "Optimal Control: Linear Quadratic Methods", 1990; integral action: common practice.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct StateFeedback {
  Matrix K;                    // u = -K x, m x n
  Matrix P;                    // Riccati solution; empty where the gain was placed
  std::vector<Complex> poles;  // of A - B K, as achieved
  double condition = 1.0;      // of the Riccati equation, or of the eigenvectors (kappa_2) where placed
  double residual = 0.0;  // relative, of the Riccati equation; where placed, the relative error of the achieved poles
  std::string warning;    // empty: nothing to warn of
};

StateFeedback lqr(const System& system, const Matrix& Q, const Matrix& R, const Matrix& N = {});

// Q is (n + p) x (n + p), over [x; z]; K is m x (n + p).
StateFeedback lqr_with_integral(const System& system, const Matrix& Q, const Matrix& R);

// The augmented plant: states [x; z], inputs u, outputs [y; z]. The reference enters as [0; I] r (discrete [0; T I] r).
System with_integrals(const System& system);

}  // namespace slipbench::linear
