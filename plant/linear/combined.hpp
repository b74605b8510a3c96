// The loops one compares: open, state feedback alone, with reference gain, and with an observer in between.
//
// Each is a System of inputs [r (p or m); d (m, adds to the plant's input); v (p, adds to the measurement)] and outputs
// [y (p, without v); u (m, at the plant, without d)], so that one response serves for output and effort:
//   open        u = r (m of them)                      states x
//   feedback    u = -K x + r (m)                       states x
//   referenced  u = -K x + N r (p)                     states x
//   observed    u = -K xh + N r (p)                    states [x; xh],  xh' = A xh + B u + L (y + v - C xh - D u)
//   integral    u = -K_x x - K_z z (p),  z' = r - y - v   states [x; z]  (discrete z[k+1] = z[k] + T (r - y - v))
//
// Separation: the poles of `observed` are those of A - B K and A - L C together; in the coordinates [x; x - xh] the estimate's error
// is not reached by r. D is allowed. Shapes refused with LinearError.
// Source: D.G. Luenberger, IEEE TAC 16 1971, 596-602.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

System open_loop(const System& system);
System feedback_loop(const System& system, const Matrix& K);
System referenced_loop(const System& system, const Matrix& K, const Matrix& N);
System observed_loop(const System& system, const Matrix& K, const Matrix& N, const Matrix& L);
System integral_loop(const System& system, const Matrix& K);  // K m x (n + p), as lqr_with_integral gives it

struct Separation {
  std::vector<Complex> controller, observer, combined;
  double distance = 0.0;  // pole_distance(controller and observer, combined)
};
Separation separation(const System& system, const Matrix& K, const Matrix& L);

}  // namespace slipbench::linear
