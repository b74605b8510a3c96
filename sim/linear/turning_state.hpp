// An estimator's state seen from a frame that turns, whatever the method: its numbers are told apart by type and name.
//
//   Vec2, SinCos              turned                    Symmetric6 (i, psi, w, T)     both pairs turned: R P R'
//   `angle`, `..._angle`      moved by the angle         all else                      the same in every frame
//
// A method whose state holds a vector or an angle in another guise would break this; a test turns every built-in one and compares.
#pragma once

#include <string_view>

#include "estimators/kalman_model.hpp"
#include "plant/math/elementary.hpp"
#include "sim/linear/turning_point.hpp"

namespace slipbench {

inline bool names_an_angle(std::string_view name) { return name == "angle" || name.ends_with("_angle"); }

template <class Real>
Symmetric6<Real> turned(const Symmetric6<Real>& P, const SinCos<Real>& by) {
  Mat<Real, 6, 6> rows = P.entry;  // R P, then R (R P)' = R P R'
  const auto turn_rows = [&](Mat<Real, 6, 6>& m) {
    for (const std::size_t first : {std::size_t{0}, std::size_t{2}}) {
      for (std::size_t c = 0; c < 6; ++c) {
        const Vec2<Real> pair = turn_forward(by, Vec2<Real>{m[first][c], m[first + 1][c]});
        m[first][c] = pair.x;
        m[first + 1][c] = pair.y;
      }
    }
  };
  turn_rows(rows);
  Symmetric6<Real> out;
  for (std::size_t r = 0; r < 6; ++r) {
    for (std::size_t c = 0; c < 6; ++c) out.entry[c][r] = rows[r][c];
  }
  turn_rows(out.entry);
  return out;
}

// Turns `item`, a field of this name, forward by the angle.
template <class Real, class Item>
void turn_item(std::string_view name, Item& item, const SinCos<Real>& by, const Real& angle_rad) {
  if constexpr (std::is_same_v<Item, Vec2<Real>>) {
    item = turn_forward(by, item);
  } else if constexpr (std::is_same_v<Item, SinCos<Real>>) {
    const Vec2<Real> v = turn_forward(by, Vec2<Real>{item.cos, item.sin});
    item = {v.y, v.x};
  } else if constexpr (std::is_same_v<Item, Symmetric6<Real>>) {
    item = turned(item, by);
  } else if constexpr (std::is_same_v<Item, Real>) {
    if (names_an_angle(name)) item = item + angle_rad;
  } else if constexpr (detail::IsArray<Item>::value) {
    for (auto& element : item) turn_item(name, element, by, angle_rad);
  } else {
    Item::each_field(item, [&](const char* field, auto& inner) { turn_item(field, inner, by, angle_rad); });
  }
}
template <class Real, class State>
State turned_state(State state, double angle_rad) {
  const SinCos<double> by = sincos(angle_rad);
  turn_item("", state, SinCos<Real>{Real(by.sin), Real(by.cos)}, Real(angle_rad));
  return state;
}

// Numbers whose truth is known at a turning point are set to it, found by name: currents, fluxes (psi_R), speed and frequency with
// their filters, the flux's angle, the load. All else is left alone.
template <class Item>
void tell_truth(std::string_view name, Item& item, const TurningPoint& p) {
  if constexpr (std::is_same_v<Item, Vec2<double>>) {
    if (name == "current") item = p.current;
    if (name == "flux") item = p.flux_ratio * p.rotor_flux;
  } else if constexpr (std::is_same_v<Item, double>) {
    if (name.starts_with("speed")) item = p.w_r;
    if (name.starts_with("frequency")) item = p.w_s;
    if (name == "angle") item = 0.0;
    if (name == "load_torque") item = p.torque_Nm;
    if (name == "started") item = 1.0;
  } else if constexpr (detail::IsArray<Item>::value) {
    for (auto& element : item) tell_truth(name, element, p);
  } else {
    Item::each_field(item, [&](const char* field, auto& inner) { tell_truth(field, inner, p); });
  }
}

}  // namespace slipbench
