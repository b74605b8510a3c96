// Drives the built command: arguments in; exit status, standard output and standard error out.
#pragma once

#include <sys/wait.h>
#include <unistd.h>

#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <nlohmann/json.hpp>
#include <sstream>
#include <string>
#include <vector>

namespace slipbench::test {

namespace fs = std::filesystem;

inline std::string content(const fs::path& path) {
  std::ifstream file(path, std::ios::binary);
  std::stringstream text;
  text << file.rdbuf();
  return text.str();
}

struct Answer {
  int status = -1;
  std::string out, err;
  [[nodiscard]] nlohmann::json json() const { return nlohmann::json::parse(out); }
};

// A folder that goes when the test ends.
class Folder {
 public:
  Folder()
      : path_(fs::temp_directory_path() /
              ("slipbench-test-" + std::to_string(::getpid()) + "-" + std::to_string(next()++))) {
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
  // `before` is a command in front, such as a time limit.
  [[nodiscard]] Answer run(const std::vector<std::string>& arguments, const std::string& before = "") const {
    std::string line = before + " '" SLIPBENCH_COMMAND "'";
    for (const std::string& argument : arguments) line += " '" + argument + "'";
    line += " > '" + file(".out") + "' 2> '" + file(".err") + "'";
    const int raw = std::system(line.c_str());
    return {WIFEXITED(raw) ? WEXITSTATUS(raw) : -1, content(file(".out")), content(file(".err"))};
  }

 private:
  static int& next() {
    static int n = 0;
    return n;
  }
  fs::path path_;
};

// A short run of an invented drive: magnetised, up to speed, a load step. Every tick is a trace row.
inline std::string scenario_text() {
  return R"(format = 1
title = "Short test drive, data invented"
seed = 5

[run]
duration_s = 0.3
plant_step_s = 50e-6
control_period_s = 100e-6
method = "rk4"
trace_period_s = 100e-6
start = "magnetised"

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

[shaft]
inertia_kgm2 = 0.02
viscous_friction_Nms = 0.001

[[load]]
kind = "profile"
torque_Nm = [[0.0, 0.0], [0.2, 0.0], [0.2, 10.0]]

[supply]
kind = "inverter"
dc_link_V = 560.0
switching_frequency_Hz = 10e3

[sensors.current]
phases = 3
noise_A = 0.1

[sensors.dc_link]
noise_V = 0.5

[sensors.speed]
kind = "ideal"

[reference]
speed_rpm = [[0.0, 0.0], [0.02, 0.0], [0.12, 500.0]]

[controller]
kind = "rotor_flux_oriented"
orientation = "indirect"
speed_from = "measured"

[[estimator]]
name = "obs"
kind = "luenberger"

[[estimator]]
name = "ekf"
kind = "extended_kalman"

[score]
from_s = 0.05
)";
}

inline std::string replaced(std::string text, const std::string& what, const std::string& by) {
  const std::size_t at = text.find(what);
  if (at == std::string::npos) throw std::runtime_error("the test's scenario has no '" + what + "'");
  return text.replace(at, what.size(), by);
}

}  // namespace slipbench::test
