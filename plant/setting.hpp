// One named number that a method (estimator, controller) lets the user set: the row that feeds reader, errors, help,
// --set and sweeps alike.
#pragma once

#include <cmath>
#include <limits>
#include <span>
#include <string>
#include <string_view>
#include <unordered_map>

namespace slipbench {

struct Setting {
  std::string_view name;     // key with its unit, e.g. "speed_filter_Hz"
  std::string_view unit;     // "Hz", "" for a pure number
  double low, high;          // allowed range, both ends included
  double fallback;           // NaN: derived from nameplate and sensors, `meaning` says how
  std::string_view meaning;  // one sentence
  bool structural = false;   // true: a choice (0/1, counts) that cannot vary between lanes of a pack
};

inline constexpr double derived = std::numeric_limits<double>::quiet_NaN();
inline constexpr double unlimited = std::numeric_limits<double>::max();

// The settings that a scenario gave, by name; `value` falls back to `otherwise` where the file is silent.
class Settings {
 public:
  void set(const std::string& name, double value) { given_[name] = value; }
  [[nodiscard]] double value(std::string_view name, double otherwise) const {
    const auto found = given_.find(std::string(name));
    return found == given_.end() ? otherwise : found->second;
  }
  [[nodiscard]] const std::unordered_map<std::string, double>& given() const { return given_; }

 private:
  std::unordered_map<std::string, double> given_;
};

}  // namespace slipbench
