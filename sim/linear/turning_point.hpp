// A steady state of the sampled drive: stator voltage held over each control period, all else turning by w_s T a period.
//
//   x_{k+1} = Phi x_k + Gamma u_k,  x = (i_s, psi_r) complex, stationary frame;  x_k = x_0 e^{j k w_s T},  u_k = u_0 e^{j k w_s T}
//   Phi = e^{A T}, Gamma = int_0^T e^{A s} ds B: the machine over one period at this speed, exact
//
// Given rotor flux, torque and speed; w_s = w_r + slip of that torque.
#pragma once

#include "plant/math/vec.hpp"
#include "plant/parameters.hpp"

namespace slipbench {

struct TurningPoint {
  double period_s = 0.0, w_s = 0.0, w_r = 0.0;  // T; electrical rad/s
  double torque_Nm = 0.0, pole_pairs = 0.0;
  double flux_ratio = 1.0;  // psi_R of the inverse-gamma circuit = flux_ratio psi_r
  Vec2<double> rotor_flux;  // psi_r at tick 0, on the alpha axis
  Vec2<double> current;     // at tick 0
  Vec2<double> voltage;     // over [-1, 0)
};

TurningPoint turning_point(const Circuit<double>& circuit, double period_s, double rotor_flux, double torque,
                           double electrical_speed);

}  // namespace slipbench
