// Stationary Kalman filter, continuous and discrete: the observer of least error covariance.
//
//   x' = A x + B u + w,  y = C x + D u + v,   E w w' = W, E v v' = V, white, independent (continuous: intensities)
//   continuous  A P + P A' - P C' V^-1 C P + W = 0,                    L = P C' V^-1
//   discrete    P = A P A' - A P C' (C P C' + V)^-1 C P A' + W,        M = P C' (C P C' + V)^-1,  L = A M,
//               P_filtered = (I - M C) P (I - M C)' + M V M'
//
// W n x n, V p x p, symmetric; W positive semidefinite; V positive definite (discrete: semidefinite). P is the covariance of the
// estimate (discrete: predicted, before the measurement). poles are those of A - L C.
// LinearError: shapes; W, V not as said, naming the eigenvalue; a mode that the outputs do not see and that does not decay, named; a
// mode on the stability limit that no noise drives, named.
// Source: R.E. Kalman, R.S. Bucy, Trans. ASME D 83 1961, 95-108; Y. Bar-Shalom, X.R. Li, T. Kirubarajan, "Estimation with
// Applications to Tracking and Navigation", 2001, ch. 5.
#pragma once

#include "plant/linear/observer.hpp"

namespace slipbench::linear {

Observer stationary_kalman(const System& system, const Matrix& W, const Matrix& V);

}  // namespace slipbench::linear
