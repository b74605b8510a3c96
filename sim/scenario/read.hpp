// From a TOML file (with --set overrides) to a checked Scenario. The only door to toml++.
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "sim/scenario/input_error.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

struct Override {
  std::string key, value;  // --set key=value, as typed
};

enum class FileKind { scenario, machine, plan, system, gains };

// Told by content: [system], top-level `scenario = "..."`, [run], only [machine], only [controller] or [estimator] without a kind. Throws InputError.
FileKind kind_of_file(const std::string& path);

// Throws InputError with file:line:column, key, what was found, what is allowed and the nearest known key.
Scenario read_scenario(const std::string& path, const std::vector<Override>& overrides = {},
                       std::optional<std::uint64_t> seed = {});
// The same from text; relative paths are relative to `folder`, errors are placed at `name`:line:column.
Scenario read_scenario_text(const std::string& text, const std::string& name, const std::string& folder,
                            const std::vector<Override>& overrides = {});
// A gain file by itself (gain_file.hpp): its title.
std::string read_gain_file(const std::string& path, const std::vector<Override>& overrides = {});
MachineSettings read_machine(const std::string& path, const std::vector<Override>& overrides = {});

// A scenario file parsed once and read many times with other overrides (sweeps): well under a millisecond a reading.
// Reading is const and may be done from several threads at once.
struct ParsedScenario;
class ScenarioFile {
 public:
  // `machines`: more machine and gain files that overrides will name, as they will name them.
  explicit ScenarioFile(const std::string& path, const std::vector<std::string>& machines = {});
  ScenarioFile(const std::string& text, const std::string& name, const std::string& folder);
  [[nodiscard]] Scenario read(const std::vector<Override>& overrides = {},
                              std::optional<std::uint64_t> seed = {}) const;
  // Paths of the machine and gain files that it names and that could be read.
  [[nodiscard]] std::vector<std::string> machine_files() const;

 private:
  std::shared_ptr<const ParsedScenario> parsed_;
};

}  // namespace slipbench
