// Shorthand that keeps the table of keys a table: one row a key.
#pragma once

#include <utility>

#include "sim/scenario/keys.hpp"

// AT(run.duration_s): the slot of that member of a Scenario; `i` is the element of the list of tables.
#define AT(member) Slot(+[](Scenario& s, std::size_t i) -> decltype(auto) { return ((void)i, (s.member)); })

namespace slipbench {

class Row {
 public:
  explicit Row(Key& key) : key_(&key) {}
  Row& must() { return key_->need = Need::required, *this; }
  Row& words(std::vector<std::string_view> w) { return key_->words = std::move(w), *this; }
  Row& with(std::vector<std::string_view> w) { return key_->when = std::move(w), *this; }
  Row& otherwise(std::string_view how) { return key_->otherwise = how, *this; }
  Row& fixed() { return key_->structural = true, *this; }
  Row& live() { return key_->live = true, *this; }

 private:
  Key* key_;
};

class Rows {
 public:
  Rows(std::vector<Key>& keys, std::string table) : keys_(keys), table_(std::move(table)) {}
  // A number, knots or a triple, with its unit and range.
  Row number(const char* name, Slot slot, std::string_view unit, Range range, std::string_view meaning) {
    keys_.push_back({.path = table_.empty() ? name : table_ + "." + name, .slot = slot, .unit = unit, .range = range});
    keys_.back().meaning = meaning;
    return Row(keys_.back());
  }
  // A word, text or choice.
  Row word(const char* name, Slot slot, std::string_view meaning) { return number(name, slot, "", {}, meaning); }

 private:
  std::vector<Key>& keys_;
  std::string table_;
};

constexpr Range positive(double high) { return {0.0, high, true}; }
constexpr Range up_to(double high) { return {0.0, high}; }
constexpr Range within(double bound) { return {-bound, bound}; }

// Bounds shared by several rows: past them a unit was mistaken.
inline constexpr double any_time = 1e6, any_speed = 1e6, any_torque = 1e7, any_voltage = 1e6, any_current = 1e6;
inline constexpr double any_frequency = 1e5, any_resistance = 1e5, any_inductance = 1e3, any_factor = 100.0;

}  // namespace slipbench
