// One named number, or table of numbers, that a method (estimator, controller) lets the user set: the row that feeds reader,
// errors, help, --set and sweeps alike.
#pragma once

#include <cmath>
#include <limits>
#include <span>
#include <string>
#include <string_view>
#include <unordered_map>
#include <utility>
#include <vector>

namespace slipbench {

// A list of numbers, or a list of matrices of one size, row by row: what gains scheduled over speed are written as.
enum class SettingShape { number, list, matrices };

struct Setting {
  std::string_view name;  // key with its unit, e.g. "speed_filter_Hz"
  std::string_view unit;  // "Hz", "" for a pure number
  double low, high;       // allowed range, both ends included
  double fallback;  // NaN: derived from nameplate and sensors, `meaning` says how; a table's default is always derived
  std::string_view meaning;                   // one sentence
  bool structural = false;                    // true: a choice (0/1, counts) that cannot vary between lanes of a pack
  SettingShape shape = SettingShape::number;  // of a table each number is within low..high
};

inline constexpr double derived = std::numeric_limits<double>::quiet_NaN();
inline constexpr double unlimited = std::numeric_limits<double>::max();

struct SettingTable {
  std::size_t count = 0, rows = 0, columns = 0;  // a list: one row a number, one column
  std::vector<double> numbers;                   // matrix after matrix, row by row
  [[nodiscard]] double operator()(std::size_t n, std::size_t row = 0, std::size_t column = 0) const {
    return numbers[(n * rows + row) * columns + column];
  }
};

// The settings that a scenario gave, by name; `value` falls back to `otherwise` where the file is silent.
class Settings {
 public:
  void set(const std::string& name, double value) { given_[name] = value; }
  [[nodiscard]] double value(std::string_view name, double otherwise) const {
    const auto found = given_.find(std::string(name));
    return found == given_.end() ? otherwise : found->second;
  }
  void set(const std::string& name, SettingTable table) { tables_[name] = std::move(table); }
  [[nodiscard]] const SettingTable* table(std::string_view name) const {  // null where the file is silent
    const auto found = tables_.find(std::string(name));
    return found == tables_.end() ? nullptr : &found->second;
  }
  [[nodiscard]] const std::unordered_map<std::string, double>& given() const { return given_; }

 private:
  std::unordered_map<std::string, double> given_;
  std::unordered_map<std::string, SettingTable> tables_;
};

}  // namespace slipbench
