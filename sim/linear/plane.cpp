#include "sim/linear/plane.hpp"

#include <cmath>

#include "plant/math/numbers.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

void check_count(const char* what, std::size_t count) {
  if (count < 2 || count > 2000)
    throw InputError("", what, std::string("a map needs 2 to 2000 ") + what + ", not " + std::to_string(count), "map");
}

void check_share(const char* what, double share) {
  if (!(share > 0.0 && share <= 10.0))
    throw InputError("", what,
                     std::string("a map's ") + what + " share of rated must lie above 0 and be at most 10, not " +
                         std::to_string(share),
                     "map");
}

}  // namespace

Plane plane_of(const MachineSettings& machine, const PlaneOptions& o) {
  check_count("speeds", o.speeds);
  check_count("torques", o.torques);
  check_share("speed", o.speed_share);
  check_share("torque", o.torque_share);
  const Nameplate plate = machine.nameplate();
  const double speed = o.speed_share * plate.speed_rpm, torque = o.torque_share * plate.torque_Nm;
  return {-speed, speed, -torque, torque, o.speeds, o.torques};
}

Plane holding(Plane plane, double speed_rpm, double torque_Nm) {
  const double speed = max(fabs(speed_rpm), plane.speed_to_rpm), torque = max(fabs(torque_Nm), plane.torque_to_Nm);
  return {-speed, speed, -torque, torque, plane.speeds, plane.torques};
}

}  // namespace slipbench
