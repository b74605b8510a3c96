// Time responses of a linear system to step, sine and noise, exact at the sampling instants.
//
//   step, noise: the input is held over each step h: x[k+1] = exp(A h) x[k] + (integral_0^h exp(A t) dt B) u[k]
//   sine: the oscillator w' = [0 f; -f 0] w is joined to the plant, so that u = amplitude * sin(f t) is exact; a discrete plant
//         sees amplitude * sin(f T k)
//
// step_s is the spacing of the answer; for a discrete system it must be 0 or its period. Rows of y, u, x are instants, columns
// outputs, inputs, states. x0: empty is zero. LinearError: shapes, step_s <= 0 for a continuous system, steps < 0.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct Response {
  std::vector<double> time_s;  // k step_s, k = 0 ... steps
  Matrix y, u, x;
  bool sampled = false;  // of a discrete system: between the samples there is nothing
};

// input is stepped from 0 to amplitude at t = 0 and held.
Response step_response(const System& system, Eigen::Index input, double step_s, Eigen::Index steps,
                       double amplitude = 1.0, const Vector& x0 = {});

Response sine_response(const System& system, Eigen::Index input, double frequency_rad_s, double step_s,
                       Eigen::Index steps, double amplitude = 1.0, const Vector& x0 = {});

// inputs (steps + 1) x m, one row an instant, held until the next: noise samples or any record. Noise of intensity S (unit^2 s)
// is samples of variance S / step_s.
Response response_to(const System& system, const Matrix& inputs, double step_s, const Vector& x0 = {});

}  // namespace slipbench::linear
