// A controller's door in C++, over any number type: what it sees at control tick k and what it commands. For double they have
// the very layout of controller_abi.h, which says what each field means.
//
//   struct Controller {
//     static constexpr std::string_view kind;
//     static constexpr bool takes_speed;   // from a sensor or an estimator: its scenario may say which
//     static constexpr std::array<Setting, n> settings;
//     template <class Real> struct Constants { ...; SLIPBENCH_FIELDS(...) };
//     template <class Real> struct State { ...; SLIPBENCH_FIELDS(...) };
//     static constexpr std::string_view state_note;   // its units, for exported code; may be left out
//     static Constants<double> prepare(const ControllerSetup&, const Settings&);
//     static State<double> begin(const ControllerSetup&, const Constants<double>&);
//     template <class Real>
//     static Command<Real> step(State<Real>&, const Measurement<Real>&, const Constants<Real>&);
//   };
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <string_view>

#include "controllers/controller_abi.h"
#include "plant/math/elementary.hpp"
#include "plant/math/frames.hpp"
#include "plant/modulation.hpp"
#include "plant/parameters.hpp"
#include "plant/setting.hpp"

namespace slipbench {

template <class Real>
struct Measurement {
  std::uint32_t size = sizeof(Measurement);
  std::uint32_t version = SLIPBENCH_CONTROLLER_ABI_VERSION;
  std::int64_t tick = 0;
  Vec2<Real> current;
  Real dc_link{}, speed{}, rotor_flux{}, rotor_flux_angle{}, speed_reference{}, torque_reference{};
  SLIPBENCH_FIELDS(current, dc_link, speed, rotor_flux, rotor_flux_angle, speed_reference, torque_reference)
};

template <class Real>
struct Command {
  std::uint32_t size = sizeof(Command);
  std::uint32_t version = SLIPBENCH_CONTROLLER_ABI_VERSION;
  Phases<Real> duty{};
  Real clipped{}, rotor_flux_reference{}, torque_reference{};
  Vec2<Real> current_reference{};  // d-q
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
  double inertia_kgm2 = 0.0;     // as believed
  double current_noise_A = 0.0;  // of a current sensor, rms a phase, ADC quantisation included
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
  double start_speed_rad_s = 0.0;        // of the shaft at tick 0, mechanical, where the flux is up
};

static_assert(sizeof(Measurement<double>) == sizeof(slipbench_measurement));
static_assert(offsetof(Measurement<double>, tick) == offsetof(slipbench_measurement, tick));
static_assert(offsetof(Measurement<double>, current.x) == offsetof(slipbench_measurement, i_alpha_A));
static_assert(offsetof(Measurement<double>, current.y) == offsetof(slipbench_measurement, i_beta_A));
static_assert(offsetof(Measurement<double>, dc_link) == offsetof(slipbench_measurement, dc_link_V));
static_assert(offsetof(Measurement<double>, speed) == offsetof(slipbench_measurement, speed_rad_s));
static_assert(offsetof(Measurement<double>, rotor_flux) == offsetof(slipbench_measurement, rotor_flux_Wb));
static_assert(offsetof(Measurement<double>, rotor_flux_angle) == offsetof(slipbench_measurement, rotor_flux_angle_rad));
static_assert(offsetof(Measurement<double>, speed_reference) == offsetof(slipbench_measurement, speed_reference_rad_s));
static_assert(offsetof(Measurement<double>, torque_reference) == offsetof(slipbench_measurement, torque_reference_Nm));
static_assert(sizeof(Command<double>) == sizeof(slipbench_command));
static_assert(offsetof(Command<double>, duty.a) == offsetof(slipbench_command, duty_a));
static_assert(offsetof(Command<double>, duty.b) == offsetof(slipbench_command, duty_b));
static_assert(offsetof(Command<double>, duty.c) == offsetof(slipbench_command, duty_c));
static_assert(offsetof(Command<double>, clipped) == offsetof(slipbench_command, clipped));
static_assert(offsetof(Command<double>, rotor_flux_reference) == offsetof(slipbench_command, rotor_flux_reference_Wb));
static_assert(offsetof(Command<double>, torque_reference) == offsetof(slipbench_command, torque_reference_Nm));
static_assert(offsetof(Command<double>, current_reference.x) == offsetof(slipbench_command, i_d_reference_A));
static_assert(offsetof(Command<double>, current_reference.y) == offsetof(slipbench_command, i_q_reference_A));

}  // namespace slipbench
