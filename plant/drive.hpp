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
  Supply supply = Supply::mains;  // structural
  bool speed_imposed = false;     // structural: a dynamometer holds the speed, the shaft equation is off
  bool inverter_ideal = false;    // structural: no dead time, no drop
  bool opposed = true;            // structural: Coulomb friction or a constant torque acts somewhere

  Machine<Real> machine{};
  Shaft<Real> shaft{};
  Load<Real> load{};
  Mains<Real> mains{};
  LegError<Real> leg{};
  SLIPBENCH_FIELDS(machine, shaft, load, mains, leg)
};

template <class Real>
struct DriveInput {
  Vec2<Real> ideal_voltage{};  // what the duties give without leg errors, V
  LegPull<Real> leg_pull{};    // V
  Real noise_torque{};         // N m, adds to the load
  Line<Real> load_profile{};   // N m
  Line<Real> imposed_speed{};  // rad/s
  SLIPBENCH_FIELDS(ideal_voltage, leg_pull, noise_torque, load_profile, imposed_speed)
};

template <class Real>
void apply_duty(const Drive<Real>& d, DriveInput<Real>& in, const Phases<Real>& duty, const Real& dc_link) {
  in.ideal_voltage = applied_voltage(duty, dc_link);
  in.leg_pull = leg_pull(leg_error_size(d.leg, duty, dc_link));
}

// What the supply gives at time t before leg errors: it does not depend on the state.
template <class Real>
Vec2<Real> source_voltage(const Drive<Real>& d, const DriveInput<Real>& in, double t) {
  return d.supply == Supply::mains ? mains_voltage(d.mains, t) : in.ideal_voltage;
}

template <class Real>
Vec2<Real> stator_voltage(const Drive<Real>& d, const DriveInput<Real>& in, const Vec2<Real>& source,
                          const Vec2<Real>& current) {
  if (d.supply == Supply::mains || d.inverter_ideal) return source;
  return source + leg_error_vector(d.leg, in.leg_pull, current);
}

template <class Real>
Real total_load(const Drive<Real>& d, const DriveInput<Real>& in, const Real& speed, double t) {
  const Real free = in.load_profile.at(t) + in.noise_torque + fan_torque(d.load, speed);
  return d.opposed ? free + d.load.opposing * d.shaft.against(speed) : free;
}

// Load and friction together.
template <class Real>
Real total_resistance(const Drive<Real>& d, const DriveInput<Real>& in, const Real& speed, double t) {
  const Real free = in.load_profile.at(t) + in.noise_torque + fan_torque(d.load, speed) + d.shaft.viscous * speed;
  return d.opposed ? free + (d.load.opposing + d.shaft.coulomb) * d.shaft.against(speed) : free;
}

// Written where it is wanted: a state of packs is too big to be handed about.
template <class Real>
void drive_derivative(const Drive<Real>& d, const DriveInput<Real>& in, const Vec2<Real>& source,
                      const DriveState<Real>& x, double t, DriveState<Real>& dx) {
  const MachineFlux<Real> psi = flux_of(x);
  const Vec2<Real> i_s = stator_current(d.machine, psi);
  const Real speed = d.speed_imposed ? in.imposed_speed.at(t) : x[4];
  const Vec2<Real> u = stator_voltage(d, in, source, i_s);
  const MachineFlux<Real> dpsi = flux_derivative(d.machine, psi, i_s, u, d.machine.pole_pairs * speed);
  dx[0] = dpsi.stator.x;
  dx[1] = dpsi.stator.y;
  dx[2] = dpsi.rotor.x;
  dx[3] = dpsi.rotor.y;
  dx[4] = d.speed_imposed ? in.imposed_speed.slope
                          : d.shaft.per_inertia * (torque(d.machine, psi, i_s) - total_resistance(d, in, speed, t));
  dx[5] = speed;
}

template <class Real>
DriveState<Real> drive_derivative(const Drive<Real>& d, const DriveInput<Real>& in, const DriveState<Real>& x,
                                  double t) {
  DriveState<Real> dx;
  drive_derivative(d, in, source_voltage(d, in, t), x, t, dx);
  return dx;
}

}  // namespace slipbench
