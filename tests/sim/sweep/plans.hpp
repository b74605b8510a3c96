// Plans and scenarios in a folder of their own for the tests of sweeps. Machine and drive are invented.
#pragma once

#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <stdexcept>
#include <string>

namespace sweep_tests {

namespace fs = std::filesystem;

// Goes when the test ends.
class Folder {
 public:
  Folder() : path_(fs::temp_directory_path() / ("slipbench-sweep-" + std::to_string(::getpid()) + "-" + next())) {
    fs::create_directories(path_);
  }
  ~Folder() { fs::remove_all(path_); }
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;
  [[nodiscard]] std::string file(const std::string& name) const { return (path_ / name).string(); }
  std::string write(const std::string& name, const std::string& text) const {
    std::ofstream(file(name), std::ios::binary) << text;
    return file(name);
  }

 private:
  static std::string next() {
    static int n = 0;
    return std::to_string(n++);
  }
  fs::path path_;
};

inline std::string replaced(std::string text, const std::string& what, const std::string& by) {
  const std::size_t at = text.find(what);
  if (at == std::string::npos) throw std::runtime_error("the test's text has no '" + what + "'");
  return text.replace(at, what.size(), by);
}

inline std::string machine_text() {
  return R"(title = "invented machine"
[machine]
pole_pairs = 2
stator_resistance_ohm = 1.6
rotor_resistance_ohm = 1.25
stator_leakage_H = 6.2e-3
rotor_leakage_H = 6.2e-3
magnetizing_inductance_H = 0.172
rated_power_W = 4000
rated_line_voltage_V = 400.0
rated_current_A = 7.85
rated_frequency_Hz = 50.0
rated_speed_rpm = 1440.0
rated_torque_Nm = 26.5
)";
}

// A short closed-loop drive with two estimators; its machine lies in machine.toml beside it.
inline std::string scenario_text() {
  return R"(title = "Short drive, data invented"
seed = 5

[run]
duration_s = 0.02
plant_step_s = 50e-6
control_period_s = 100e-6
trace_period_s = 1e-3
start = "magnetised"

[machine]
file = "machine.toml"

[shaft]
inertia_kgm2 = 0.02

[[load]]
kind = "constant_torque"
torque_Nm = 2.0

[supply]
kind = "inverter"
dc_link_V = 560.0
switching_frequency_Hz = 10e3

[sensors.current]
noise_A = 0.1

[sensors.dc_link]

[sensors.speed]
kind = "ideal"

[reference]
speed_rpm = [[0.0, 0.0], [0.02, 100.0]]

[controller]
kind = "rotor_flux_oriented"

[[estimator]]
name = "obs"
kind = "luenberger"

[[estimator]]
name = "ekf"
kind = "extended_kalman"
)";
}

inline std::string grid_text() {
  return R"(title = "grid"
scenario = "scenario.toml"
runs = 2

[[vary]]
key = "belief.rotor_resistance"
values = [0.7, 1.0, 1.5]

[[vary]]
keys = ["belief.stator_leakage", "belief.rotor_leakage"]
from = 0.8
to = 1.2
count = 5
)";
}

inline std::string drawn_text() {
  return R"(scenario = "scenario.toml"

[sample]
kind = "latin_hypercube"
count = 70
seed = 3

[[sample.key]]
key = "belief.rotor_resistance"
distribution = "uniform"
low = 0.7
high = 1.4

[[sample.key]]
keys = ["belief.stator_leakage", "belief.rotor_leakage"]
distribution = "normal"
mean = 1.0
sigma = 0.05
)";
}

// The scenario and its machine are there; returns the plan's path.
inline std::string write_plan(const Folder& folder, const std::string& plan,
                              const std::string& scenario = scenario_text()) {
  folder.write("machine.toml", machine_text());
  folder.write("scenario.toml", scenario);
  return folder.write("plan.toml", plan);
}

}  // namespace sweep_tests
