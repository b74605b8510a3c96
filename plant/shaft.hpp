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

  // Which way what opposes motion acts: sat(w / w_0).
  [[nodiscard]] Real against(const Real& speed) const { return sat(speed * per_width); }
};

}  // namespace slipbench
