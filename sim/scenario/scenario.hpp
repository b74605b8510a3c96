// A scenario as plain data, in the units of its file. Read and checked by the reader; trusted afterwards.
#pragma once

#include <array>
#include <cstdint>
#include <string>
#include <utility>
#include <vector>

#include "plant/parameters.hpp"
#include "plant/setting.hpp"

namespace slipbench {

// (time in s, value); straight lines between knots, held outside them, equal times make a step.
using Knots = std::vector<std::array<double, 2>>;

struct RunSettings {
  double duration_s = 0.0, plant_step_s = 0.0, control_period_s = 0.0, trace_period_s = 0.0;
  std::string method = "rk4";        // euler | midpoint | rk4 | cash_karp5
  std::string start = "standstill";  // standstill | magnetised | steady
  double initial_speed_rpm = 0.0;
};

struct MachineSettings {
  std::string file, circuit_form = "t";  // t | inverse_gamma | gamma
  std::int64_t pole_pairs = 0;
  double stator_resistance_ohm = 0, rotor_resistance_ohm = 0;
  double stator_leakage_H = 0, rotor_leakage_H = 0, magnetizing_inductance_H = 0;
  double total_leakage_H = 0;  // inverse_gamma and gamma forms: the one leakage there is
  double rated_power_W = 0, rated_line_voltage_V = 0, rated_current_A = 0, rated_frequency_Hz = 0;
  double rated_speed_rpm = 0, rated_torque_Nm = 0, rated_power_factor = 0, rated_efficiency = 0;
  std::string connection = "star";
  double resistance_temperature_degC = 20.0;
  std::string title, source;  // a machine file's own, read from one alone

  [[nodiscard]] Circuit<double> circuit() const;  // T form, whatever form was given
  [[nodiscard]] Nameplate nameplate() const;
};

struct ShaftSettings {
  double inertia_kgm2 = 0, viscous_friction_Nms = 0, coulomb_friction_Nm = 0;
  double friction_width_rpm = 1.0;  // speed over which Coulomb friction and opposing loads turn their sign
};

struct LoadSettings {
  std::string kind;                                 // profile | constant_torque | fan | imposed_speed
  Knots torque_profile;                             // profile: torque_Nm
  double torque_Nm = 0;                             // constant_torque
  double rated_torque_Nm = 0, rated_speed_rpm = 0;  // fan
  Knots speed_rpm;                                  // imposed_speed
};

struct SupplySettings {
  std::string kind;  // mains | inverter
  double line_voltage_V = 0, frequency_Hz = 0, phase_deg = 0;
  double dc_link_V = 0, switching_frequency_Hz = 0, dead_time_s = 0, device_drop_V = 0, zero_current_width_A = 0;
  std::string model = "averaged", modulation = "space_vector";
};

struct ProcessNoiseSettings {
  double load_torque_Nm = 0;          // rms of a random walk over 1 s
  double current_A = 0, flux_Wb = 0;  // rms added each control period, each of alpha and beta
};

struct AnalogSensorSettings {  // one kind of converter channel; `bits` = 0: ideal, `bandwidth_Hz` = 0: none
  bool present = false;
  double noise = 0, bandwidth_Hz = 0, range = 0;
  std::int64_t bits = 0;
  std::array<double, 3> offset{}, gain_error{};
};

struct SpeedSensorSettings {
  std::string kind = "none";  // none | ideal | tachogenerator | encoder
  double noise_rpm = 0, bandwidth_Hz = 0;
  std::int64_t lines_per_rev = 1024;
  double clock_Hz = 10e6, window_s = 1e-3, timeout_s = 0.1;
};

struct SensorSettings {
  AnalogSensorSettings current, voltage, dc_link;
  std::int64_t current_phases = 3;
  SpeedSensorSettings speed;
};

struct ReferenceSettings {
  Knots speed_rpm, torque_Nm;  // one of them, empty without a controller
  double rotor_flux_Wb = 0;    // 0: the circuit's at rated voltage, frequency and speed
};

struct ControllerSettings {
  std::string kind;  // empty: none (mains)
  std::string orientation = "indirect", flux_from, speed_from = "measured";
  std::int64_t delay_periods = 1;
  bool dead_time_compensation = true;
  std::string file;                        // gain file
  std::string precision = "double";        // double | float
  Settings settings;                       // of that kind
  [[nodiscard]] bool takes_speed() const;  // from a sensor or an estimator
};

struct EstimatorSettings {
  std::string name, kind, file;
  std::string precision = "double";  // double | float
  Settings settings;
  [[nodiscard]] bool needs_speed() const;  // from a sensor
};

struct BeliefSettings {  // factors on the true value at t = 0
  double stator_resistance = 1, rotor_resistance = 1, magnetizing_inductance = 1, stator_leakage = 1;
  double rotor_leakage = 1, inertia = 1, dead_time = 1, device_drop = 1, dc_link = 1;
  std::string file;  // a machine file of its own
  bool has_machine = false;
  MachineSettings machine;  // read from `file`, factors apply to it
};

struct DriftSettings {
  std::string quantity;  // stator_resistance | rotor_resistance | magnetizing_inductance | ...
  Knots factor;
};

struct EventSettings {
  double at_s = 0;
  std::string kind;       // speed_sensor_fault | current_sensor_fault | speed_from
  std::string fault;      // no_signal | stuck | repaired
  std::string phase;      // current_sensor_fault: a | b | c
  std::string estimator;  // speed_from: an estimator's name, or measured

  // The control tick it acts at: the first at or after its time; a time that is a tick up to rounding is that tick.
  [[nodiscard]] std::int64_t tick(double control_period_s) const;
};

struct ScoreSettings {
  double from_s = 0, to_s = 0;  // to_s filled with the run's end by the reader
  double lost_error = 0.1, lost_for_s = 0.05, settled_error = 0.02;
};

struct Scenario {
  std::string path;  // file it came from, "" for text
  std::string title;
  std::uint64_t seed = 1;
  RunSettings run;
  MachineSettings machine;
  ShaftSettings shaft;
  std::vector<LoadSettings> loads;
  SupplySettings supply;
  ProcessNoiseSettings process_noise;
  SensorSettings sensors;
  ReferenceSettings reference;
  ControllerSettings controller;
  std::vector<EstimatorSettings> estimators;
  BeliefSettings belief;
  std::vector<DriftSettings> drifts;
  std::vector<EventSettings> events;  // in file order
  ScoreSettings score;

  [[nodiscard]] bool on_mains() const { return supply.kind == "mains"; }
  [[nodiscard]] Circuit<double> believed_circuit() const;
  [[nodiscard]] double believed_inertia() const { return shaft.inertia_kgm2 * belief.inertia; }
};

}  // namespace slipbench
