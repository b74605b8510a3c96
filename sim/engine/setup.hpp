// Everything that one run needs, prepared once in double: RunShape must be equal in all cases that run side by side, the
// numbers may differ from lane to lane.
//
// Shape: counts, kinds, choices. Numbers: constants, first state, knots, seeds. A state is that at first_tick, sensors read
// once before it; taken from a run at t = 0 it is a run that goes on (a steady start after its run-in).
#pragma once

#include <cstdint>
#include <memory>
#include <vector>

#include "plant/drive.hpp"
#include "plant/profile.hpp"
#include "sim/engine/observer.hpp"
#include "sim/engine/speed_sensor.hpp"

namespace slipbench {

struct Scenario;
enum class Stepper;
template <class Real>
class EstimatorPortOf;
template <class Real>
class ControllerPortOf;

enum class Drifting {
  nothing,
  stator_resistance,
  rotor_resistance,
  magnetizing_inductance,
  stator_leakage,
  rotor_leakage,
  inertia,
  dc_link
};

struct PlantShape {
  Supply supply = Supply::mains;
  bool speed_imposed = false, inverter_ideal = false, opposed = false;  // as in Drive
  Stepper method{};
  double step_s = 0.0;
  std::size_t profiles = 0;  // loads given as such
  std::vector<Drifting> drifts;
  bool operator==(const PlantShape&) const = default;
};

struct SensorShape {
  bool two_currents = false, has_voltage = false, has_dc_link = false, has_speed = false;
  bool current_filtered = false, voltage_filtered = false, dc_link_filtered = false;
  SpeedSensorTiming speed;
  bool operator==(const SensorShape&) const = default;
};

// An estimator or controller: which one, and the choices that its settings make.
struct MethodShape {
  int index = -1;       // in the list of built-in ones; -1: a program's own, or none
  bool single = false;  // stepped in float
  std::vector<double> choices;
  bool operator==(const MethodShape&) const = default;
};

struct ControlShape {
  bool present = false, speed_control = true, compensated = false;
  bool from_standstill = true;  // mains: nothing lay at the terminals before t = 0
  std::int64_t delay_periods = 0;
  std::int64_t speed_from = -1, flux_from = -1;  // estimator that closes the loop, -1: none
  MethodShape controller;
  std::vector<MethodShape> estimators;
  bool operator==(const ControlShape&) const = default;
};

struct RunShape {
  std::int64_t first_tick = 0;  // < 0: a run-in before t = 0
  std::int64_t steps_per_control = 1, steps_per_trace = 1, steps = 0;
  double control_period_s = 0.0;
  PlantShape plant;
  SensorShape sensors;
  ControlShape control;
  bool operator==(const RunShape&) const = default;
};

template <class Real>
struct PlantNumbers {
  Drive<Real> drive;                                    // without drift
  Circuit<Real> circuit;                                // likewise
  Real inertia{}, dc_link{};                            // likewise, kg m^2, V
  Real flux_limit{}, speed_limit{};                     // beyond them the run has diverged, Wb, rad/s
  Real walk_per_tick{}, current_noise{}, flux_noise{};  // process noise, rms a period: N m, A, Wb
  Real per_speed{}, per_flux{}, rated_torque{};         // what standing still is a share of: 1/(rad/s), 1/Wb, N m
  SLIPBENCH_FIELDS(drive, circuit, inertia, dc_link, flux_limit, speed_limit, walk_per_tick, current_noise, flux_noise,
                   per_speed, per_flux, rated_torque)
};

template <class Real>
struct SensorNumbers {
  std::array<AnalogSensor<Real>, 3> current, voltage;
  AnalogSensor<Real> dc_link;
  SpeedSensor<Real> speed;
  Real believed_dc_link{};  // V; NaN on mains
  SLIPBENCH_FIELDS(current, voltage, dc_link, speed, believed_dc_link)
};

template <class Real>
struct Reading {
  Vec2<Real> current;  // A
  Vec2<Real> voltage;  // V, on mains; 0 with an inverter
  Real dc_link{};      // V; NaN on mains
  Real speed{};        // mechanical rad/s; NaN without a sensor
  SLIPBENCH_FIELDS(current, voltage, dc_link, speed)
};

template <class Real>
struct SensorState {
  std::array<AnalogState<Real>, 3> current, voltage;
  AnalogState<Real> dc_link;
  SpeedSensorState<Real> speed;
  Real angle_before{};  // of the shaft as the encoder counts it, rad
  Reading<Real> reading;
  SLIPBENCH_FIELDS(current, voltage, dc_link, speed, angle_before, reading)
};

template <class Real>
struct RunState {
  DriveState<Real> drive{};
  Phases<Real> duty{};                    // acting over [k-1, k) when tick k begins
  std::array<Phases<Real>, 2> pending{};  // commands not yet acting, oldest first
  SensorState<Real> sensors;
  SLIPBENCH_FIELDS(drive, duty, pending, sensors)
};

// Constants and state of a built-in method in the order of each_number.
struct MethodNumbers {
  std::vector<double> constants, state;
};

struct RunSetup {
  RunShape shape;
  PlantNumbers<double> plant;
  SensorNumbers<double> sensors;
  LegError<double> believed_leg;
  RunState<double> state;
  std::vector<Profile> loads, drifts;                        // torque N m; factors
  Profile imposed_speed, speed_reference, torque_reference;  // rad/s, rad/s, N m
  std::vector<MethodNumbers> estimators;
  MethodNumbers controller;
  std::uint64_t seed = 0;
  std::uint32_t noise_run = 0;
  RunInfo info;

  // A program's own methods, at their first state: such a setup serves one run. Empty for built-in ones.
  std::vector<std::shared_ptr<EstimatorPortOf<double>>> own_estimators;
  std::shared_ptr<ControllerPortOf<double>> own_controller;
};

// The setups of a pack's lanes, in order; of one run alone: one.
using Cases = std::span<const RunSetup* const>;

// Throws InputError where the scenario can't be run from there (no equilibrium, a method that refuses its settings).
RunSetup prepare_run(const Scenario& scenario, std::uint32_t noise_run, std::int64_t first_tick);

}  // namespace slipbench
