// The columns of a trace in contract order, with units and meanings; the true plant's as one row of numbers.
#pragma once

#include <array>
#include <cstddef>
#include <string>
#include <string_view>
#include <vector>

namespace slipbench {

struct Column {
  std::string name, unit, meaning;
};

// Index of each plant column in a row.
enum class P : std::size_t {
  time,
  speed_rpm,
  speed_reference_rpm,
  torque,
  load_torque,
  stator_frequency,
  u_alpha,
  u_beta,
  i_alpha,
  i_beta,
  i_d,
  i_q,
  i_a,
  i_b,
  i_c,
  rotor_flux,
  rotor_flux_angle,
  rotor_flux_reference,
  dc_link,
  stator_resistance,
  rotor_resistance,
  count
};
inline constexpr std::size_t plant_column_count = static_cast<std::size_t>(P::count);

struct PlantRow : std::array<double, plant_column_count> {
  double& operator[](P column) {
    return std::array<double, plant_column_count>::operator[](static_cast<std::size_t>(column));
  }
  double operator[](P column) const {
    return std::array<double, plant_column_count>::operator[](static_cast<std::size_t>(column));
  }
};

// time_s, speed_rpm, ... in the order of P.
const std::vector<Column>& plant_columns();
// NAME.speed_rpm, NAME.rotor_flux_Wb, NAME.rotor_flux_angle_rad, NAME.torque_Nm, NAME.trust.
inline constexpr std::size_t estimator_column_count = 5;
std::vector<Column> estimator_columns(const std::string& name);

}  // namespace slipbench
