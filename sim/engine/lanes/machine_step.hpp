// The machine on a held voltage with a constant load torque, as five numbers: the smallest plant that leans on every number
// type, and the measure of their speed.
//
//   x = (psi_s alpha, psi_s beta, psi_r alpha, psi_r beta, w),  J dw/dt = T - T_load
//
// psi Wb, w mechanical rad/s; the flux equations are those of plant/machine.hpp.
#pragma once

#include <array>

#include "plant/machine.hpp"

namespace slipbench {

template <class Real>
using MachineState = std::array<Real, 5>;

template <class Real>
struct MachineOnVoltage {
  Machine<Real> machine;
  Real per_inertia{}, load_torque{};  // 1/J, N m
  Vec2<Real> voltage;                 // V
  SLIPBENCH_FIELDS(machine, per_inertia, load_torque, voltage)

  void operator()(const MachineState<Real>& x, MachineState<Real>& dxdt, double) const {
    const MachineFlux<Real> psi{{x[0], x[1]}, {x[2], x[3]}};
    const Vec2<Real> i_s = stator_current(machine, psi);
    const MachineFlux<Real> rate = flux_derivative(machine, psi, i_s, voltage, machine.pole_pairs * x[4]);
    dxdt[0] = rate.stator.x;
    dxdt[1] = rate.stator.y;
    dxdt[2] = rate.rotor.x;
    dxdt[3] = rate.rotor.y;
    dxdt[4] = per_inertia * (torque(machine, psi, i_s) - load_torque);
  }
};

}  // namespace slipbench
