// A grid over the torque-speed plane: motor torque against mechanical speed, both ends on the grid.
#pragma once

#include <cstddef>
#include <functional>

#include "sim/scenario/scenario.hpp"

namespace slipbench {

struct Plane {
  double speed_from_rpm = 0.0, speed_to_rpm = 0.0, torque_from_Nm = 0.0, torque_to_Nm = 0.0;
  std::size_t speeds = 0, torques = 0;  // at least 2 each

  [[nodiscard]] double speed_step_rpm() const {
    return (speed_to_rpm - speed_from_rpm) / static_cast<double>(speeds - 1);
  }
  [[nodiscard]] double torque_step_Nm() const {
    return (torque_to_Nm - torque_from_Nm) / static_cast<double>(torques - 1);
  }
  [[nodiscard]] double speed_rpm(std::size_t i) const {
    return speed_from_rpm + static_cast<double>(i) * speed_step_rpm();
  }
  [[nodiscard]] double torque_Nm(std::size_t k) const {
    return torque_from_Nm + static_cast<double>(k) * torque_step_Nm();
  }
  [[nodiscard]] std::size_t points() const { return speeds * torques; }
  [[nodiscard]] std::size_t index(std::size_t speed, std::size_t torque) const { return speed * torques + torque; }
};

struct PlanePoint {
  double speed_rpm = 0.0, torque_Nm = 0.0;
};

// What a plane is to hold: plus and minus these shares of the rated values.
struct PlaneOptions {
  double speed_share = 0.5, torque_share = 1.5;
  std::size_t speeds = 121, torques = 61;
};
// Throws InputError for fewer than 2 or more than 2000 points along an axis, or shares that are not positive.
Plane plane_of(const MachineSettings& machine, const PlaneOptions& options);
// Widened evenly, as a whole, so that it holds plus and minus this speed and torque.
Plane holding(Plane plane, double speed_rpm, double torque_Nm);

// Told the share done, now and then; false stops the work, and what there is comes back.
using MapProgress = std::function<bool(double done)>;

}  // namespace slipbench
