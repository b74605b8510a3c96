// A linear time-invariant system in state-space form, continuous or discrete.
//
//   x' = A x + B u,  y = C x + D u          sample_period_s = 0
//   x[k+1] = A x[k] + B u[k]                sample_period_s > 0
//
// n states, m inputs, p outputs; A n x n, B n x m, C p x n, D p x m. Units are the caller's. n, m or p may be 0.
#pragma once

#include <Eigen/Core>
#include <complex>
#include <stdexcept>
#include <string>
#include <vector>

namespace slipbench::linear {

using Matrix = Eigen::MatrixXd;
using Vector = Eigen::VectorXd;
using Complex = std::complex<double>;
using ComplexMatrix = Eigen::MatrixXcd;

struct System {
  Matrix A, B, C, D;
  double sample_period_s = 0.0;                                     // 0: continuous time
  std::vector<std::string> state_names, input_names, output_names;  // empty: x1, x2, ...; u1, ...; y1, ...

  [[nodiscard]] Eigen::Index order() const { return A.rows(); }
  [[nodiscard]] Eigen::Index inputs() const { return B.cols(); }
  [[nodiscard]] Eigen::Index outputs() const { return C.rows(); }
  [[nodiscard]] bool discrete() const { return sample_period_s > 0.0; }
  [[nodiscard]] std::string state_name(Eigen::Index i) const;
  [[nodiscard]] std::string input_name(Eigen::Index i) const;
  [[nodiscard]] std::string output_name(Eigen::Index i) const;
};

// What was asked can't be had: one sentence that names the mode, matrix or pole that stands in the way.
struct LinearError : std::runtime_error {
  using std::runtime_error::runtime_error;
};

// The system with an empty D made p x m zeros. LinearError where shapes do not fit or a number is not finite.
System checked(System system);

// A complex number as people read it: "-2.5", "-1.2 + 3.4j" (six digits).
std::string text_of(Complex value);

}  // namespace slipbench::linear
