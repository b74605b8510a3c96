// Loads on the shaft; several add up.
//
//   profile            T = line(t), sign kept (a hoist pulls both ways)
//   constant torque    T = T_0 sat(w / w_0), opposing motion, none at rest; w_0 as for Coulomb friction (shaft.hpp)
//   fan                T = T_n (w / w_n)^2 sign(w), opposing motion
//
// T N m, w mechanical rad/s, w_0 the width over which an opposing load turns its sign.
#pragma once

#include "plant/profile.hpp"

namespace slipbench {

template <class Real>
struct Load {
  Real opposing{};  // sum of constant torques
  Real fan{};       // sum of T_n / w_n^2
  SLIPBENCH_FIELDS(opposing, fan)
};

template <class Real>
Real fan_torque(const Load<Real>& load, const Real& speed) {
  return load.fan * speed * fabs(speed);
}

}  // namespace slipbench
