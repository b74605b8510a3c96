// Scenario texts for the tests and a way to spoil them. Machine and drive are invented.
#pragma once

#include <algorithm>
#include <stdexcept>
#include <string>

#include "sim/scenario/read.hpp"

namespace scenario_tests {

// Every table of the format, as the format's description shows it.
inline std::string whole_text() {
  return R"(format = 1
title = "all of it"
seed = 5

[run]
duration_s = 2.0
plant_step_s = 10e-6
control_period_s = 100e-6
method = "midpoint"
trace_period_s = 1e-3
start = "standstill"
initial_speed_rpm = 3

[machine]
pole_pairs = 2
stator_resistance_ohm = 1.6
rotor_resistance_ohm = 1.29
stator_leakage_H = 0.0062
rotor_leakage_H = 0.0061
magnetizing_inductance_H = 0.172
rated_power_W = 4000.0
rated_line_voltage_V = 400
rated_current_A = 7.85
rated_frequency_Hz = 50.0
rated_speed_rpm = 1440.0
rated_torque_Nm = 26.5
rated_power_factor = 0.82
rated_efficiency = 0.9
connection = "delta"
resistance_temperature_degC = 75.0

[shaft]
inertia_kgm2 = 0.05
viscous_friction_Nms = 0.002
coulomb_friction_Nm = 0.5
friction_width_rpm = 2.0

[[load]]
kind = "profile"
torque_Nm = [[0.0, 0.0], [0.5, 0.0], [0.5, 8.0]]

[[load]]
kind = "constant_torque"
torque_Nm = 2

[[load]]
kind = "fan"
rated_torque_Nm = 10.0
rated_speed_rpm = 1500.0

[supply]
kind = "inverter"
dc_link_V = 560.0
switching_frequency_Hz = 10e3
dead_time_s = 2e-6
device_drop_V = 1.0
zero_current_width_A = 0.3
model = "averaged"
modulation = "discontinuous"

[process_noise]
load_torque_Nm = 0.1
current_A = 0.01
flux_Wb = 1e-4

[sensors.current]
phases = 2
noise_A = 0.1
offset_A = [0.01, -0.02, 0]
gain_error = [0.01, -0.01, 0.0]
bandwidth_Hz = 20e3
bits = 12
range_A = 30.0

[sensors.dc_link]
noise_V = 0.5
gain_error = 0.005
bits = 10
range_V = 800.0

[sensors.speed]
kind = "encoder"
lines_per_rev = 2048
clock_Hz = 20e6
window_s = 2e-3
timeout_s = 0.2

[reference]
speed_rpm = [[0.0, 0.0], [0.2, 0.0], [0.7, 1200.0]]
rotor_flux_Wb = 0.9

[controller]
kind = "rotor_flux_oriented"
orientation = "direct"
flux_from = "ekf"
speed_from = "fast_1"
delay_periods = 0
dead_time_compensation = false
current_bandwidth_Hz = 300

[[estimator]]
name = "ekf"
kind = "extended_kalman"
load_torque = true

[[estimator]]
name = "fast_1"
kind = "luenberger"
adaptation_bandwidth_Hz = 80

[belief]
rotor_resistance = 0.8
inertia = 1.2
dead_time = 0

[[drift]]
quantity = "rotor_resistance"
factor = [[0.0, 1.0], [1.0, 1.0], [2.0, 1.5]]

[score]
from_s = 0.5
to_s = 1.5
lost_error = 0.2
lost_for_s = 0.1
settled_error = 0.03
)";
}

// A short one on mains, without controller.
inline std::string mains_text() {
  return R"([run]
duration_s = 0.1
plant_step_s = 2e-5
control_period_s = 1e-4
trace_period_s = 1e-3
[machine]
pole_pairs = 2
stator_resistance_ohm = 1.6
rotor_resistance_ohm = 1.29
stator_leakage_H = 0.0062
rotor_leakage_H = 0.0062
magnetizing_inductance_H = 0.172
rated_power_W = 4000.0
rated_line_voltage_V = 400.0
rated_current_A = 7.85
rated_frequency_Hz = 50.0
rated_speed_rpm = 1440.0
[shaft]
inertia_kgm2 = 0.05
[supply]
kind = "mains"
line_voltage_V = 400.0
frequency_Hz = 50.0
)";
}

// `text` with the first `from` replaced; throws where there is none, so that no test spoils nothing.
inline std::string with(std::string text, const std::string& from, const std::string& to) {
  const std::size_t at = text.find(from);
  if (at == std::string::npos) throw std::logic_error("the text holds no " + from);
  return text.replace(at, from.size(), to);
}

inline slipbench::Scenario read(const std::string& text, const std::vector<slipbench::Override>& overrides = {}) {
  return slipbench::read_scenario_text(text, "file.toml", "/nowhere", overrides);
}

// What reading throws; an empty one where nothing is wrong.
inline slipbench::InputError error_of(const std::string& text, const std::vector<slipbench::Override>& overrides = {}) {
  try {
    read(text, overrides);
  } catch (const slipbench::InputError& error) {
    return error;
  }
  return {"", "", "", "none"};
}

// "file.toml:line:column" of the n-th character of a text, counted here anew.
inline std::string place_of(const std::string& text, std::size_t offset) {
  const auto line = 1 + std::count(text.begin(), text.begin() + static_cast<std::ptrdiff_t>(offset), '\n');
  const std::size_t start = offset == 0 ? std::string::npos : text.rfind('\n', offset - 1);
  const std::size_t column = start == std::string::npos ? offset + 1 : offset - start;
  return "file.toml:" + std::to_string(line) + ":" + std::to_string(column);
}

}  // namespace scenario_tests
