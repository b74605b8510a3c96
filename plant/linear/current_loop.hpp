// The machine at constant speed as a linear system, and the gains of a current loop and of an observer around it.
//
// Stationary frame, states (i, psi), each alpha and beta; input the stator voltage:
//   L_sigma di/dt = u - R i + (1/tau_r - j w_r) g psi,   dpsi/dt = L_m / tau_r i - (1/tau_r - j w_r) psi
// Rotor-flux frame, turning at w_r (the slip's part of the cross-coupling is the controller's): psi_q does not hear of i_q, for
// the frame follows the flux; in samples of period T with the voltages under way as states, x = (i, psi, u(k-1), ...):
//   x(k+1) = F x(k) + G u(k),   y = i.  The voltage stands still while the frame turns; u is as seen in the middle of its period.
//
// Weights: 1 on each component of the current error, rho = 1 / (alpha_c L_sigma)^2 on the voltage beyond what makes up for the
// flux's push on the current (the back-EMF is no effort to be saved; a lone inductance then has the pole alpha_c), w_I^2 on the integral of the error. N lets the current settle at its reference; with integral action less, by
// K_I times the error that the loop without it sums up on the way: so that no overshoot has to pay for that sum.
//
// psi = psi_r of the T circuit Wb, i A, u V (all peak), w_r electrical rad/s, alpha_c, w_I rad/s, R = R_s + g^2 R_r, g = L_m/L_r.
// Source: B.D.O. Anderson, J.B. Moore, "Optimal Control: Linear Quadratic Methods", 1990; the model: any text on machines.
#pragma once

#include "plant/linear/system.hpp"
#include "plant/parameters.hpp"

namespace slipbench::linear {

// Continuous, stationary frame; outputs are the currents.
System machine_at_speed(const Circuit<double>& circuit, double electrical_speed);

struct CurrentLoopDesign {
  Circuit<double> circuit;
  double period_s = 0.0;
  int delay_periods = 1;            // 0, 1, 2
  double bandwidth = 0.0;           // alpha_c
  double integral_bandwidth = 0.0;  // w_I; 0: no integral action
};

// Discrete, rotor-flux frame: 4 + 2 d states.
System current_loop(const CurrentLoopDesign& design, double electrical_speed);

struct CurrentLoopGains {
  Matrix K, K_integral,
      N;  // u = N i_ref - K x + sum of K_integral (i_ref - i); 2 x (4 + 2 d), 2 x 2 (empty: none), 2 x 2
  std::vector<Complex> poles;              // of the loop with integral action
  double residual = 0.0, condition = 1.0;  // of the Riccati equation
  std::string warning;
};

// LinearError where there is none. At speed 0 gains across d and q are exactly zero.
CurrentLoopGains current_loop_gains(const CurrentLoopDesign& design, double electrical_speed);

// Observer of (i, psi) in the stationary frame from the current, filter form: x = x- + M (i - C x-). 4 x 2, of rotating
// form: pairs (a, -b; b, a).
struct ObserverNoise {
  double current_A = 0.0;  // rms of each measured component
  double voltage_V = 0.0;  // rms of each component of the voltage, fresh each period
  double flux_Wb = 0.0;    // rms added to each component of the flux a period
};
Matrix stationary_observer(const Circuit<double>& circuit, double period_s, double electrical_speed,
                           const ObserverNoise& noise);
// Error poles e^(-factor bandwidth T) and e^(-(factor / tau_r - j w_r) T): the flux's error keeps turning with the rotor.
Matrix faster_observer(const Circuit<double>& circuit, double period_s, double electrical_speed, double bandwidth,
                       double factor);

}  // namespace slipbench::linear
