// Matrices and responses of linear systems as small tables with the names of inputs and outputs.
#pragma once

#include <string>

#include "plant/linear/frequency_response.hpp"
#include "plant/linear/system.hpp"

namespace slipbench {

// p x m, a row an output, a column an input.
std::string matrix_table(const linear::Matrix& gain, const linear::System& system);
std::string gain_phase_table(const linear::FrequencyPoint& point, const linear::System& system);
// Any matrix with names of its rows and columns.
std::string named_table(const linear::Matrix& m, const std::vector<std::string>& rows,
                        const std::vector<std::string>& columns);

std::vector<std::string> state_names(const linear::System& system);
std::vector<std::string> input_names(const linear::System& system);
std::vector<std::string> output_names(const linear::System& system);

}  // namespace slipbench
