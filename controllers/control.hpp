// A controller's door in C++, over any number type: what it sees at control tick k and what it commands.
// SI units; motor convention; space vectors amplitude-invariant in the stationary frame.
//
//   struct Controller {
//     static constexpr std::string_view kind;
//     static constexpr std::array<Setting, n> settings;
//     template <class Real> struct Constants { ...; SLIPBENCH_FIELDS(...) };
//     template <class Real> struct State { ...; SLIPBENCH_FIELDS(...) };
//     static Constants<double> prepare(const ControllerSetup&, const Settings&);
//     static State<double> begin(const ControllerSetup&, const Constants<double>&);
//     template <class Real>
//     static Command<Real> step(State<Real>&, const Measurement<Real>&, const Constants<Real>&);
//   };
#pragma once

#include <array>
#include <string_view>

#include "plant/math/elementary.hpp"
#include "plant/math/frames.hpp"
#include "plant/modulation.hpp"
#include "plant/parameters.hpp"
#include "plant/setting.hpp"

namespace slipbench {

template <class Real>
struct Measurement {
  Vec2<Real> current;                     // measured at k, A
  Real dc_link{};                         // measured at k, V
  Real speed{};                           // mechanical rad/s, from the sensor or the estimator that closes the loop
  Real rotor_flux{}, rotor_flux_angle{};  // of the estimator named by flux_from (direct orientation), else 0
  Real speed_reference{};                 // rad/s (speed control)
  Real torque_reference{};                // N m (torque control)
  SLIPBENCH_FIELDS(current, dc_link, speed, rotor_flux, rotor_flux_angle, speed_reference, torque_reference)
};

template <class Real>
struct Command {
  Phases<Real> duty{};             // of each leg, 0..1, acting over [k+d, k+d+1)
  Real clipped{};                  // 1 where the voltage limit cut the command, else 0
  Real rotor_flux_reference{};     // after field weakening, Wb
  Real torque_reference{};         // after limits, N m
  Vec2<Real> current_reference{};  // d-q, A
  SLIPBENCH_FIELDS(duty, clipped, rotor_flux_reference, torque_reference, current_reference)
};

// Constants of the inverter as believed (mean error of a leg, see plant/inverter_averaged.hpp).
struct InverterBelief {
  double dc_link_V = 0.0;  // nominal, for design only
  double dead_time_s = 0.0, device_drop_V = 0.0, switching_frequency_Hz = 0.0, zero_current_width_A = 0.0;
};

struct ControllerSetup {
  Circuit<double> circuit;  // as believed
  Nameplate nameplate;
  double inertia_kgm2 = 0.0;  // as believed
  double control_period_s = 100e-6;
  int delay_periods = 1;
  Modulation modulation = Modulation::space_vector;
  InverterBelief inverter;
  bool compensate_dead_time = true;
  bool direct_orientation = false;       // angle and flux from an estimator
  bool speed_control = true;             // false: torque_reference is followed
  bool sensorless = false;               // speed comes from an estimator: default bandwidths are lower
  double rotor_flux_reference_Wb = 0.0;  // upper limit
  double start_rotor_flux_Wb = 0.0;      // rotor flux up at tick 0, along alpha; 0: magnetise first
};

}  // namespace slipbench
