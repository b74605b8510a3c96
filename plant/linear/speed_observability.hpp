// Where speed can be seen in the terminals: local observability of the machine from its stator currents, voltages known.
//
//   states   i_s, psi_r in the frame that turns with the flux; w_r electrical
//   model    constant_speed   w_r' = 0
//            unknown_load     w_r' = p (T - T_load - B w) / J, T_load' = 0, T_load a sixth state
//            known_load       w_r' = p (T - T_load - B w) / J, T_load known
//   output   i_s; rows up to derivative n - 1 (plant/linear/lie.hpp)
//
// Scaled so that rows and columns can be compared: states per rated peak current, rated flux (phase peak voltage over rated frequency),
// rated electrical frequency, rated torque; currents per rated peak, time per 1 / rated angular frequency (the usual per-unit system:
// stator and rotor transients are then of order 1, so no row swamps the others). The smallest singular value is thus what the currents'
// course over about one per-unit time would show, in rated currents, of a state that differs by its rated value. It is a measure for comparing points
// of one machine, not a property of the rank alone.
// At steady state and stator frequency zero the first two models lose rank: w_r = -(2/3) R_r T / (p psi_r^2).
// Source: C. Canudas de Wit, A. Youssef, J.P. Barbot, P. Martin, F. Malrait, "Observability conditions of induction motors at low
// frequencies", CDC 2000; S. Ibarra-Rojas, J. Moreno, G. Espinosa-Perez, Automatica 40(6), 2004, 1079-1085 (both from memory).
#pragma once

#include <string_view>

#include "plant/linear/machine_system.hpp"

namespace slipbench::linear {

enum class SpeedModel { constant_speed, unknown_load, known_load };
std::string_view name_of(SpeedModel model);  // as above

struct PerUnit {
  double current = 1.0, flux = 1.0, frequency = 1.0, torque = 1.0;  // A peak, Wb, electrical rad/s, N m
};
PerUnit per_unit_of(const Nameplate& plate);

struct SpeedObservability {
  double smallest = 0.0, largest = 0.0;  // singular values of the scaled matrix
  Eigen::Index states = 0, rank = 0;     // rank: those above 1e-10 of the largest
};

// Scaled observability matrix. The point need not be an equilibrium: then `voltage` and `load_torque_Nm` matter.
struct SpeedPoint {
  MachinePoint machine;  // w_k: the stator frequency, at which the voltage turns
  Vec2<double> voltage;
  double load_torque_Nm = 0.0;
};
Matrix speed_observability_matrix(const SpeedPoint& point, SpeedModel model, const PerUnit& unit);
SpeedObservability speed_observability(const SpeedPoint& point, SpeedModel model, const PerUnit& unit);

// The steady state with this flux, torque and speed, its load balanced.
SpeedPoint steady_speed_point(const Circuit<double>& circuit, double inertia_kgm2, double damping, double rotor_flux,
                              double torque, double speed_rad_s);

// Electrical speed at which a machine with this flux and torque stands at stator frequency w_s: -slip + w_s.
double speed_at_frequency(const Circuit<double>& circuit, double rotor_flux, double torque, double w_s);

}  // namespace slipbench::linear
