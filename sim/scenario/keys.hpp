// The one table of scenario keys. Every row says what a key is called, what it may hold, what it means and where it goes;
// reading, defaults, errors, --set, help, sweeps and live control are all driven by it.
//
// A path is dotted; "[]" marks a list of tables: "load[].kind" stands for load.0.kind, load.1.kind, ... A key's default
// is what a fresh Scenario holds there, unless `otherwise` says how it follows from other keys.
#pragma once

#include <array>
#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <variant>
#include <vector>

#include "plant/setting.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

// What a key may hold, ends included unless `open` (then above `low`).
struct Range {
  double low = -unlimited, high = unlimited;
  bool open = false;
  [[nodiscard]] bool holds(double x) const { return (open ? x > low : x >= low) && x <= high; }  // false for NaN
  [[nodiscard]] std::string text() const;
};

// A row that a method (estimator, controller) brings with it.
struct MethodSetting {
  const Setting* setting = nullptr;
  Settings& (*of)(Scenario&, std::size_t) = nullptr;
};

// Where a value goes; its type is the key's type. The index counts elements of the list of tables the key is in.
using Slot = std::variant<double& (*)(Scenario&, std::size_t), std::int64_t& (*)(Scenario&, std::size_t),
                          std::uint64_t& (*)(Scenario&, std::size_t), bool& (*)(Scenario&, std::size_t),
                          std::string& (*)(Scenario&, std::size_t), Knots& (*)(Scenario&, std::size_t),
                          std::array<double, 3>& (*)(Scenario&, std::size_t), MethodSetting>;

enum class Need { optional, required };

struct Key {
  std::string path;
  Slot slot;
  std::string_view unit = {};
  Range range = {};  // of the number, or of each number in knots and triples
  Need need = Need::optional;
  std::vector<std::string_view> words{};  // allowed words; empty: any text
  std::vector<std::string_view> when{};   // belongs to these words of its table's selector; empty: to all
  std::string_view otherwise{};           // default where it follows from other keys
  std::string_view meaning{};
  bool structural = false;  // fixes what runs or how often: cannot vary between lanes of a pack
  bool live = false;        // may be changed while a run is under way

  [[nodiscard]] std::string_view section() const;             // "load[]" of "load[].kind"
  [[nodiscard]] std::string_view name() const;                // "kind"
  [[nodiscard]] bool numeric() const { return !structural; }  // holds real numbers that a sweep may vary
  [[nodiscard]] std::string allowed() const;                  // "a number above 0 and at most 10", "one of euler, rk4"
};

// A table of the file. `enter` prepares the Scenario for it (count: elements of a list).
struct Section {
  std::string_view path;  // "run", "load[]", "sensors.current"
  Need need = Need::optional;
  std::string_view selector{};   // the key whose word decides which others belong: "kind"
  std::string_view rest_from{};  // the key that names a file which gives what is missing here: "file"
  void (*enter)(Scenario&, std::size_t count) = nullptr;
  std::string_view meaning{};
  [[nodiscard]] bool is_list() const { return path.ends_with("[]"); }
};

const std::vector<Key>& scenario_keys();
const std::vector<Section>& scenario_sections();
const Section* find_section(std::string_view path);

// What may stand beside [machine] in a machine file, as text but for the first.
inline constexpr std::array<std::string_view, 3> machine_file_heads = {"format", "title", "source"};

// Its parts: keys_plant.cpp, keys_drive.cpp, method_keys.cpp.
void plant_keys(std::vector<Key>& keys);
void drive_keys(std::vector<Key>& keys);
// Rows of the methods' own settings, one a method and setting, and the kinds there are.
std::vector<Key> method_keys();
std::vector<std::string_view> estimator_kinds();
std::vector<std::string_view> controller_kinds();
// A kind beside those built in (sim/engine/own_methods.hpp is the door); `kind` and `settings` must outlive the program's
// last scenario. Not while another thread adds or reads. Throws std::logic_error once the table is built, for a kind that
// is there already, and for settings that cannot be told from other keys.
void add_estimator_keys(std::string_view kind, std::span<const Setting> settings);
void add_controller_keys(std::string_view kind, std::span<const Setting> settings, bool takes_speed);
// Those that are told a speed, from a sensor or an estimator.
std::vector<std::string_view> speed_taking_controllers();

// "load.0.torque_Nm" -> row path "load[].torque_Nm" and index 0.
struct KeyPath {
  std::string path;
  std::size_t index = 0;
};
KeyPath row_path(std::string_view dotted);

// The row of a dotted key in this scenario (its kinds decide between rows); null if there is none.
const Key* find_key(Scenario& scenario, std::string_view dotted);
// Sets one real number of a scenario that has been read; defaults that follow from others stay, relations are not
// checked again (ScenarioFile::read does both). False where the key is no real number; InputError beyond its range.
bool set_number(Scenario& scenario, std::string_view dotted, double value);

}  // namespace slipbench
