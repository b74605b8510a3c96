// The columns of a trace in contract order, with units and meanings.
#pragma once

#include <string>
#include <vector>

#include "sim/engine/plant_row.hpp"

namespace slipbench {

struct Column {
  std::string name, unit, meaning;
};

// time_s, speed_rpm, ... in the order of P.
const std::vector<Column>& plant_columns();
// NAME.speed_rpm, NAME.rotor_flux_Wb, NAME.rotor_flux_angle_rad, NAME.torque_Nm, NAME.trust.
inline constexpr std::size_t estimator_column_count = 5;
std::vector<Column> estimator_columns(const std::string& name);

}  // namespace slipbench
