// The shaft: one inertia, viscous and Coulomb friction.
//
//   J dw/dt = T - T_load - B w - T_c sat(w / w_0)
//
// w mechanical rad/s, T N m, J kg m^2, B N m s, T_c N m. Coulomb friction turns its sign over the width w_0, so that an
// explicit step stays stable while T_c h / (J w_0) < 1; scenarios are checked against that.
#pragma once

#include "plant/math/fields.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

template <class Real>
struct Shaft {
  Real per_inertia{};  // 1/J
  Real viscous{};      // B
  Real coulomb{};      // T_c
  Real per_width{};    // 1/w_0
  SLIPBENCH_FIELDS(per_inertia, viscous, coulomb, per_width)
};

template <class Real>
Real viscous_friction(const Shaft<Real>& s, const Real& speed) {
  return s.viscous * speed;
}
template <class Real>
Real coulomb_friction(const Shaft<Real>& s, const Real& speed) {
  return s.coulomb * sat(speed * s.per_width);
}

}  // namespace slipbench
