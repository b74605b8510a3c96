// The table of keys as rows for people and programs: what `check --keys`, the reference in configs/README.md, the schemas
// and shell completion are written from. Nothing is typed here a second time: a default is what a fresh Scenario holds.
#pragma once

#include <array>
#include <cstdint>
#include <string>
#include <variant>
#include <vector>

#include "sim/scenario/keys.hpp"

namespace slipbench {

// What a key's value is made of.
enum class Holds { number, whole, truth, text, knots, triple, list, matrices };

struct KeyReference {
  using Value = std::variant<std::monostate, double, std::int64_t, bool, std::string, std::array<double, 3>>;

  const Key* key = nullptr;
  Holds holds = Holds::number;
  Value fallback;  // monostate: none (required, empty, or as `otherwise` says)

  [[nodiscard]] std::string allowed_text() const;  // "0 < x <= 1e+06", "euler | rk4", "[[time, x], ...], 0 <= x <= 5"
  [[nodiscard]] std::string default_text() const;  // "required", "rk4", "the control frequency", "none"
};

struct SectionReference {
  const Section* section = nullptr;
  std::vector<KeyReference> keys;  // in the table's order

  [[nodiscard]] std::string head() const;  // "[run]", "[[load]]"; "" for the top of the file
};

// Every section of the table, in its order.
std::vector<SectionReference> scenario_reference();

// A row's path with the list's first element: "load.0.kind", as --set takes it.
std::string first_element(const std::string& path);

}  // namespace slipbench
