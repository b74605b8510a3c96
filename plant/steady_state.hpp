// Steady states of the machine: on a stiff sinusoidal supply at a slip, at the stable slip that carries a load, and on
// impressed rotor flux.
//
//   Z(s) = R_s + j w L_s + s w^2 L_m^2 / (R_r + j s w L_r),   I_s = U / Z,   I_r = -j s w L_m / (R_r + j s w L_r) I_s
//   rotor flux orientation: i_d = psi_r / L_m, i_q = T L_r / (3/2 p L_m psi_r), w_slip = R_r L_m i_q / (L_r psi_r)
//
// Peak space vectors, the voltage on the real axis in the first form, the rotor flux on the real axis in the second; w
// electrical rad/s of the supply. In double, for start-up and analysis.
// Source: W. Leonhard, "Control of Electrical Drives"; any text on machines.
#pragma once

#include <functional>
#include <optional>

#include "plant/machine.hpp"

namespace slipbench {

struct SteadyState {
  MachineFlux<double> flux;       // at the instant when the reference vector lies on the real axis
  Vec2<double> current, voltage;  // stator
  double torque = 0.0, slip_frequency = 0.0, stator_frequency = 0.0, electrical_speed = 0.0;  // N m, electrical rad/s
};

SteadyState steady_at_slip(const Circuit<double>& circuit, double phase_peak_V, double stator_frequency, double slip);

// Slip of the motoring pull-out torque (the generating one is its negative).
double pull_out_slip(const Circuit<double>& circuit, double stator_frequency);

// The stable slip at which the machine's torque equals demand(mechanical speed); nothing when the demand is beyond pull-out.
std::optional<double> stable_slip(const Circuit<double>& circuit, double phase_peak_V, double stator_frequency,
                                  const std::function<double(double)>& demand);

// |psi_r| at rated voltage, frequency and speed, Wb.
double rated_rotor_flux(const Circuit<double>& circuit, const Nameplate& nameplate);

SteadyState steady_at_flux(const Circuit<double>& circuit, double rotor_flux, double torque, double electrical_speed);

}  // namespace slipbench
