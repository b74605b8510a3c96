// Figure of a comparison: for a few figures of merit, each estimator's mean with its 95 % interval over the single runs.
#pragma once

#include <string>

#include "tools/slipbench/comparison.hpp"

namespace slipbench {

std::string compare_figure(const Comparison& comparison, const Scenario& scenario);

}  // namespace slipbench
