// From nodes to a Scenario, driven by the table of keys: every key known, of its type, in its range, none missing.
#pragma once

#include <string>
#include <string_view>

#include "sim/scenario/keys.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

// The whole file. Throws InputError. Relations between keys are check.hpp's.
void fill(Scenario& scenario, const Node& root);
// One table of it, e.g. "machine" (a machine file's), shown as `shown` in errors.
void fill_section(Scenario& scenario, const Node& table, std::string_view section, const std::string& shown);

[[noreturn]] void refuse(const Place& place, const std::string& key, const std::string& message,
                         const std::string& code);
// `section` ("run", "load[]") as `shown` ("load.0") holds `typed`, which no row knows.
[[noreturn]] void refuse_unknown(const Place& place, std::string_view section, const std::string& shown,
                                 std::string_view typed);

}  // namespace slipbench
