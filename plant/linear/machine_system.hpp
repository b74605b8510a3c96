// The induction machine in a frame that turns at w_k, as a linear system about an operating point.
//
//   psi_s  = sigma L_s i_s + (L_m / L_r) psi_r
//   i_s'   = (L_r psi_s' - L_m psi_r') / D - j w_k i_s           fluxes' rates of plant/machine.hpp, stationary
//   psi_r' = -R_r i_r + j (w_r - w_k) psi_r
//   J w'   = T - T_load - B w                                                      w mechanical
//
// States i_d, i_q (A), psi_d, psi_q (Wb), then w (rad/s); inputs u_d, u_q (V), then the load torque (N m); outputs i_d, i_q, then w.
// alpha, beta instead of d, q where the frame stands still (w_k = 0). B is all that resists and grows with speed, load included, N m s.
#pragma once

#include "plant/linear/system.hpp"
#include "plant/machine.hpp"
#include "plant/steady_state.hpp"

namespace slipbench::linear {

struct MachinePoint {
  Circuit<double> circuit;
  double frame_frequency = 0.0;              // w_k, electrical rad/s
  Vec2<double> current, rotor_flux;          // in that frame
  double speed_rad_s = 0.0;                  // mechanical
  double inertia_kgm2 = 0.0, damping = 0.0;  // J, B
};

// Of a steady state: in its own synchronous frame.
MachinePoint point_of(const Circuit<double>& circuit, const SteadyState& steady);

// Speed held: 4 states, 2 inputs, 2 outputs.
System machine_at_speed(const MachinePoint& point);
// Speed by the shaft's equation: 5 states, 3 inputs, 2 outputs, or 3 with the speed measured. LinearError without inertia.
System machine_on_shaft(const MachinePoint& point, bool speed_measured);

// What both and the observability of speed are made of: (i_s, psi_r)' at these states.
template <class Real>
struct CurrentFluxRate {
  Vec2<Real> current, flux;
  Real torque;
};
template <class Real>
CurrentFluxRate<Real> current_flux_rate(const Machine<Real>& m, const Real& w_k, const Vec2<Real>& current,
                                        const Vec2<Real>& rotor_flux, const Vec2<Real>& voltage, const Real& w_r) {
  const MachineFlux<Real> psi{(Real(1.0) / m.per_Ls) * (current + m.per_Lm * rotor_flux), rotor_flux};
  const MachineFlux<Real> rate = flux_derivative(m, psi, current, voltage, w_r);
  return {m.per_Ls * rate.stator - m.per_Lm * rate.rotor - w_k * quarter_turn(current),
          rate.rotor - w_k * quarter_turn(rotor_flux), torque(m, psi, current)};
}

}  // namespace slipbench::linear
