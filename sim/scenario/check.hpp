// What keys mean together: defaults that follow from other keys, and relations that must hold, each refused with its
// reason at the key that breaks it.
#pragma once

#include "sim/scenario/scenario.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

// Fills the defaults that rows of the table describe in `otherwise`.
void derive_defaults(Scenario& scenario, const Node& root);
// Throws InputError, placed by `root`.
void check_relations(const Scenario& scenario, const Node& root);
// A machine alone; `table` is its [machine], shown as `shown` ("machine", "belief.file").
void check_machine(const MachineSettings& machine, const Node& root, const std::string& table);

// Throws at the dotted key, or where it would stand if the file is silent.
[[noreturn]] void refuse_at(const Node& root, const std::string& dotted, const std::string& message,
                            const std::string& code = "relation");

// a is n b with n = 1, 2, ..., to a relative 1e-9: what decimal fractions lose in binary, and no more.
bool is_whole_multiple(double a, double b);

}  // namespace slipbench
