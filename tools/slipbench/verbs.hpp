// The verbs: each takes a request and returns the exit status. InputError and OutsideError pass through to `main`.
#pragma once

#include <string>

#include "sim/sweep/cluster_run.hpp"
#include "tools/slipbench/options.hpp"

namespace slipbench {

enum ExitStatus : int { done = 0, bad_result = 1, bad_input = 2, outside_failed = 3, stopped = 130 };

int run_verb(const Request& request);
int check_verb(const Request& request);
int compare_verb(const Request& request);
int sweep_verb(const Request& request);
int analyse_verb(const Request& request);
int design_verb(const Request& request);
int board_verb(const Request& request);
int export_verb(const Request& request);
int search_verb(const Request& request);  // sweep --search
// sweep --on slurm.
ClusterOutcome sweep_on_slurm(const Request& request, const SweepPlan& plan, Store& store);
// check --keys, check --schema.
int print_reference(const Request& request);

// Throws InputError when the file is of another kind than the verb wants.
void want_scenario(const Request& request);
void want_plan(const Request& request);
// "a scenario", "a machine file", ...
std::string kind_text(FileKind kind);
// To standard output; OutsideError when it does not arrive.
void print(const std::string& text);

}  // namespace slipbench
