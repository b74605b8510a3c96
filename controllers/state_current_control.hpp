// Current loop by state feedback in the rotor-flux frame, gains scheduled over speed.
//
//   u = v + j w_slip L_sigma i,  v = N i_ref - K x + z,    x = (i, psi, v(k-1), v(k-2))    each d and q
//   z(k+1) = z(k) + K_I (i_ref - i_measured) + a (u_given - u),  |z| within the voltage limit; z = 0 without integral action
//
// K, K_I, N belong to |w_r| as they stand; at a negative speed the machine is its mirror image (q turned round), and so are
// they. They are designed for a frame that turns with the rotor; what u adds to v makes up for the slip's part of the
// cross-coupling, so that one schedule serves every load. The delayed voltages are those the duties really gave, in the frame of
// their own time; with fewer than two periods of delay their columns of K are zero. a = K_I,dd / K_dd at the first point.
//
// u, z V; i A; psi = psi_r Wb (all peak); w_r, w_slip electrical rad/s. K V/A, V/Wb and 1; K_I V/A a period; N V/A.
// Source: G. Franklin, J.D. Powell, M. Workman, "Digital Control of Dynamic Systems", ch. 8 (delay as state, integral
// action; from memory); the mirror and the slip's part derived here.
#pragma once

#include "controllers/voltage_command.hpp"
#include "plant/math/schedule.hpp"

namespace slipbench {

inline constexpr std::size_t feedback_columns = 8;  // of K: i, psi, u(k-1), u(k-2)
inline constexpr std::size_t scheduled_gains =
    2 * (feedback_columns + 2 + 2);  // row d and row q of K, then of K_I, then of N

template <class Real>
struct StateCurrentConstants {
  Schedule<Real, scheduled_gains> gains;  // over |w_r|
  Real back{};                            // a
  Real integral_action{};                 // 1: z acts
  Real resistance{}, leakage{};           // R, L_sigma
  Real flux_ratio{}, rotor_rate{};        // L_m / L_r, 1 / tau_r
  Real delay{};                           // d
  LegConstants<Real> legs;
  SLIPBENCH_FIELDS(gains, back, integral_action, resistance, leakage, flux_ratio, rotor_rate, delay, legs)
};

template <class Real>
struct StateCurrentState {
  Vec2<Real> integral;  // z
  CommandedVoltages<Real> commanded{};
  std::array<Vec2<Real>, 2> given{};  // v(k-1), v(k-2)
  Real asked{};                       // |u| before the limit
  SLIPBENCH_FIELDS(integral, commanded, given, asked)
};

// v that holds this current and flux: what a drive that is taken over has been given.
template <class Real>
Vec2<Real> holding_voltage(const StateCurrentConstants<Real>& c, const RotorFrame<Real>& f) {
  const Real emf = c.flux_ratio * f.flux, drop = f.electrical_speed * c.leakage;
  return {c.resistance * f.current.x - drop * f.current.y - c.rotor_rate * emf,
          c.resistance * f.current.y + drop * f.current.x + f.electrical_speed * emf};
}

// State: the frame's current and `flux`, seen from it (d, q), Wb. `measured`: the current that is to have no error, likewise.
template <class Real>
VoltageCommand<Real> control_current(StateCurrentState<Real>& s, const StateCurrentConstants<Real>& c,
                                     const RotorFrame<Real>& f, const Vec2<Real>& flux, const Vec2<Real>& measured,
                                     const Vec2<Real>& reference, const Real& limit, const Real& dc_link) {
  section<Real>("K, K_I, N at |w_r|: straight lines between the points; mirrored where the speed is negative");
  const Real turn = sign(f.electrical_speed);
  const auto mirror = [&](const Vec2<Real>& x) { return Vec2<Real>{x.x, turn * x.y}; };
  const std::array<Real, scheduled_gains> gains = at(c.gains, fabs(f.electrical_speed));
  SLIPBENCH_LABEL(turn)
  label_each("K_d", &gains[0], feedback_columns);
  label_each("K_q", &gains[feedback_columns], feedback_columns);
  label_each("K_I", &gains[2 * feedback_columns], 4);
  label_each("N", &gains[2 * feedback_columns + 4], 4);
  // Two rows of `gains` from `first` on, times a vector of pairs.
  const auto times = [&]<std::size_t pairs>(std::size_t first, const std::array<Vec2<Real>, pairs>& x) {
    std::array<Real, 2> y{};
    for (std::size_t row = 0; row < 2; ++row) {
      const std::size_t from = first + row * 2 * pairs;
      y[row] = gains[from] * x[0].x + gains[from + 1] * x[0].y;
      for (std::size_t n = 1; n < pairs; ++n)
        y[row] = y[row] + gains[from + 2 * n] * x[n].x + gains[from + 2 * n + 1] * x[n].y;
    }
    return mirror(Vec2<Real>{y[0], y[1]});
  };
  using One = std::array<Vec2<Real>, 1>;
  using All = std::array<Vec2<Real>, 4>;
  constexpr std::size_t integral_rows = 2 * feedback_columns, reference_rows = integral_rows + 4;

  section<Real>("u = N i_ref - K x + z + j w_slip L_sigma i,  x = (i, psi, v(k-1), v(k-2))");
  const Vec2<Real> error = reference - measured;
  const Vec2<Real> fed_back = times(0, All{mirror(f.current), mirror(flux), mirror(s.given[0]), mirror(s.given[1])});
  const Vec2<Real> slip_drop = ((f.stator_frequency - f.electrical_speed) * c.leakage) * quarter_turn(f.current);
  const Vec2<Real> wanted = times(reference_rows, One{mirror(reference)}) - fed_back + s.integral + slip_drop;
  s.asked = magnitude(wanted);
  label_d_q("error", error);
  label_d_q("fed_back", fed_back);
  label_d_q("slip_drop", slip_drop);
  label_d_q("wanted", wanted);

  const VoltageCommand<Real> out = command_voltage(s.commanded, c.legs, f, wanted, reference, limit, dc_link);
  section<Real>("v = u_given - j w_slip L_sigma i;  z = z + K_I (i_ref - i) + a (u_given - u), held within the circle");
  s.given = {out.given - slip_drop, s.given[0]};
  const Vec2<Real> grown = times(integral_rows, One{mirror(error)}) + c.back * out.missing;
  const Vec2<Real> integral = s.integral + c.integral_action * grown;
  label_d_q("grown", grown);
  label_d_q("integral", integral);
  s.integral = {clamp(integral.x, -limit, limit), clamp(integral.y, -limit, limit)};
  return out;
}

}  // namespace slipbench
