// Plans and scenarios in a folder of their own for the tests of sweeps. Machine and drive are invented.
#pragma once

#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <iterator>
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

// The drive and its machine are files beside this one: tests/tools/sweeps.py reads them, too.
inline std::string own_file(const std::string& name) {
  std::ifstream file(SLIPBENCH_SOURCE_DIR "/tests/sim/sweep/" + name, std::ios::binary);
  if (!file) throw std::runtime_error("no file '" + name + "' beside the tests of sweeps");
  return {std::istreambuf_iterator<char>(file), {}};
}
inline std::string machine_text() { return own_file("machine.toml"); }

// A short closed-loop drive with two estimators; its machine lies in machine.toml beside it.
inline std::string scenario_text() { return own_file("short_drive.toml"); }

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
