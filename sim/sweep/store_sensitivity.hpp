// Sensitivity indices of a drawn plan's figures, out of its store: rows stream by in case order, memory does not grow with them.
//
// The output of a case is the mean of its noise runs, so that an index tells of keys, not of noise; a case that lacks a run's figure
// (never run, diverged, refused) is lost, and with it its base point.
#pragma once

#include <string>
#include <vector>

#include "sim/sweep/plan.hpp"
#include "sim/sweep/sensitivity.hpp"
#include "sim/sweep/store.hpp"

namespace slipbench {

struct FigureSensitivity {
  std::string figure;
  Sensitivity shares;  // keys as in names of `drawn_names`
};

// Each draw's key; of keys that share one, "a+b".
std::vector<std::string> drawn_names(const SweepPlan& plan);

// Of a plan with [sample]; `figures` are columns of the store.
std::vector<FigureSensitivity> sensitivities_of(const SweepPlan& plan, const Store& store,
                                                const std::vector<std::string>& figures);

}  // namespace slipbench
