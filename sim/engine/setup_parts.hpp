// The parts of a RunSetup that stand for themselves: the true plant and its sensors, from a scenario.
#pragma once

#include "sim/engine/setup.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

void prepare_plant(RunSetup& run, const Scenario& scenario);
void prepare_sensors(RunSetup& run, const Scenario& scenario);

std::vector<Column> measured_columns(const Scenario& scenario);
double current_noise(const Scenario& scenario);  // rms of a phase, rounding included, A

}  // namespace slipbench
