// The whole plant as one right-hand side: supply, machine, shaft, load.
//
// State (6): psi_s alpha, beta; psi_r alpha, beta (Wb); mechanical speed (rad/s); mechanical angle (rad).
// Inputs stand still over a control period (voltage of the duties, the noise on the load) or run along one straight line over a
// plant step (profile, imposed speed).
#pragma once

#include <array>

#include "plant/inverter_averaged.hpp"
#include "plant/load.hpp"
#include "plant/machine.hpp"
#include "plant/mains.hpp"
#include "plant/shaft.hpp"

namespace slipbench {

template <class Real>
using DriveState = std::array<Real, 6>;

template <class Real>
MachineFlux<Real> flux_of(const DriveState<Real>& x) {
  return {{x[0], x[1]}, {x[2], x[3]}};
}

enum class Supply { mains, inverter };

template <class Real>
struct Drive {
  Supply supply = Supply::mains;   // structural
  bool speed_imposed = false;      // structural: a dynamometer holds the speed, the shaft equation is off
  bool inverter_ideal = false;     // structural: no dead time, no drop

  Machine<Real> machine{};
  Shaft<Real> shaft{};
  Load<Real> load{};
  Mains<Real> mains{};
  LegError<Real> leg{};
  SLIPBENCH_FIELDS(machine, shaft, load, mains, leg)
};

template <class Real>
struct DriveInput {
  Vec2<Real> ideal_voltage{};      // what the duties give without leg errors, V
  Phases<Real> leg_error_size{};   // V
  Real noise_torque{};             // N m, adds to the load
  Line<Real> load_profile{};       // N m
  Line<Real> imposed_speed{};      // rad/s
  SLIPBENCH_FIELDS(ideal_voltage, leg_error_size, noise_torque, load_profile, imposed_speed)
};

template <class Real>
void apply_duty(const Drive<Real>& d, DriveInput<Real>& in, const Phases<Real>& duty, const Real& dc_link) {
  in.ideal_voltage = applied_voltage(duty, dc_link);
  in.leg_error_size = leg_error_size(d.leg, duty, dc_link);
}

template <class Real>
Vec2<Real> stator_voltage(const Drive<Real>& d, const DriveInput<Real>& in, const Vec2<Real>& current, double t) {
  if (d.supply == Supply::mains) return mains_voltage(d.mains, t);
  if (d.inverter_ideal) return in.ideal_voltage;
  return in.ideal_voltage + clarke(leg_errors(d.leg, phases_of(current), in.leg_error_size));
}

template <class Real>
Real total_load(const Drive<Real>& d, const DriveInput<Real>& in, const Real& speed, double t) {
  return load_torque(d.load, in.load_profile.at(t), speed) + in.noise_torque;
}

template <class Real>
DriveState<Real> drive_derivative(const Drive<Real>& d, const DriveInput<Real>& in, const DriveState<Real>& x, double t) {
  const MachineFlux<Real> psi = flux_of(x);
  const Vec2<Real> i_s = stator_current(d.machine, psi);
  const Real speed = d.speed_imposed ? in.imposed_speed.at(t) : x[4];
  const Vec2<Real> u = stator_voltage(d, in, i_s, t);
  const MachineFlux<Real> dpsi = flux_derivative(d.machine, psi, i_s, u, d.machine.pole_pairs * speed);
  const Real dspeed = d.speed_imposed
                          ? in.imposed_speed.slope
                          : acceleration(d.shaft, torque(d.machine, psi, i_s), total_load(d, in, speed, t), speed);
  return {dpsi.stator.x, dpsi.stator.y, dpsi.rotor.x, dpsi.rotor.y, dspeed, speed};
}

}  // namespace slipbench
