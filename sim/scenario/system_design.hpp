// [design] of a state-space file: which keys go with which kind, and their shapes.
#pragma once

#include <span>
#include <string_view>

#include "sim/scenario/system_file.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

struct DesignKey {
  enum class Holds { kind, rule, matrix, poles, names, number, positive };
  std::string_view name, kinds;  // kinds that know it, apart by blanks
  Holds holds;
  std::string_view meaning;
  [[nodiscard]] bool goes_with(std::string_view kind) const;
};
std::span<const DesignKey> design_keys();
std::span<const std::string_view> design_kinds();
std::span<const std::string_view> pi_rules();

// `system`: reduced, as the gains are for. Throws InputError.
DesignRequest read_design(const Node& node, const linear::System& system);

}  // namespace slipbench
