// Maps of the torque-speed plane as CSV: one header line, a row a point, speed the slower; the shortest text that reads back the same.
//
//   observability   speed_rpm, torque_Nm, stator_frequency_Hz, rotor_flux_Wb, smallest_singular_value
//   path            time_s, speed_rpm, torque_Nm, stator_frequency_Hz, rotor_flux_Wb, blind (0 or 1), smallest_singular_value
//   estimator       speed_rpm, torque_Nm, state (stable, marginal, unstable, unsettled, beyond), slowest_per_s, speed_error_rpm
#pragma once

#include <string>

#include "sim/linear/estimator_map.hpp"

namespace slipbench {

std::string csv_of(const ObservabilityMap& map);
std::string csv_of(const ScenarioPath& path);
std::string csv_of(const EstimatorMap& map);
const char* name_of(EstimatorPoint::State state);

}  // namespace slipbench
