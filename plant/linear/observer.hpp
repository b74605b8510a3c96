// Observers of full order by pole placement, and what a fast one costs in noise.
//
//   continuous  xh' = A xh + B u + L (y - C xh - D u)          discrete  xh[k+1] = A xh[k] + B u[k] + L (y[k] - C xh[k] - D u[k])
//
// Error e = x - xh: e' = (A - L C) e - L v with measurement noise v. L n x p, by duality: L' places A' - C'L'.
// Sources: D.G. Luenberger, IEEE TAC 16 1971, 596-602; 2 to 5 times faster than the controller: common practice.
#pragma once

#include "plant/linear/lqr.hpp"

namespace slipbench::linear {

struct Observer {
  Matrix L;                    // n x p
  std::vector<Complex> poles;  // of A - L C, as achieved
  double condition = 1.0;      // as in StateFeedback
  double residual = 0.0;
  std::string warning;
  Matrix P;              // stationary Kalman: covariance of e (discrete: predicted); else empty
  Matrix P_filtered, M;  // discrete Kalman: covariance after the measurement, and gain xh+ = xh + M (y - C xh - D u)
};

// LinearError as place(); an unobservable mode that was not wished is named.
Observer observer_by_poles(const System& system, const std::vector<Complex>& poles);

// Poles of A - B K moved factor times further: s -> factor s; z -> z^factor, that is |z|^factor at the angle factor * arg z, and at
// arg z where that would pass pi or z is real and negative. factor > 0.
std::vector<Complex> faster_poles(const System& system, const Matrix& K, double factor);
Observer observer_faster_than(const System& system, const Matrix& K, double factor);

// Stationary covariance of the estimate's error under measurement noise alone, n x n.
//   continuous: (A - L C) P + P (A - L C)' + L V L' = 0, V intensity (unit^2 s); discrete: P = (A - L C) P (A - L C)' + L V L', V variance
// V p x p; empty: I. LinearError where A - L C is not stable.
Matrix noise_covariance(const System& system, const Matrix& L, const Matrix& V = {});

struct FactorCost {
  double factor = 0.0;
  Observer observer;
  Vector rms;              // each state's stationary error per unit noise on every output: sqrt(diag P)
  double slowest_s = 0.0;  // time constant of the observer's slowest pole
};

// One row a factor, in the order given.
std::vector<FactorCost> sweep_factor(const System& system, const Matrix& K, const std::vector<double>& factors,
                                     const Matrix& V = {});

}  // namespace slipbench::linear
