// The true plant at one instant as one row of numbers, in the order of a trace's columns.
#pragma once

#include <array>
#include <cstddef>

namespace slipbench {

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

template <class Real>
struct PlantRowOf : std::array<Real, plant_column_count> {
  Real& operator[](P column) {
    return std::array<Real, plant_column_count>::operator[](static_cast<std::size_t>(column));
  }
  const Real& operator[](P column) const {
    return std::array<Real, plant_column_count>::operator[](static_cast<std::size_t>(column));
  }
};
using PlantRow = PlantRowOf<double>;

inline constexpr double rad_s_in_rpm = 3.14159265358979323846 / 30.0;

}  // namespace slipbench
