// Incremental encoder, speed by M/T evaluation: edges counted against the time between the outer ones.
//
//   edge k     lies at shaft angle k 2 pi / (4 N): N lines a turn, two channels, four edges a line
//   time t_k   straight line between plant steps, then down to whole counts of the clock f_c
//   window     speed = (k_last - k_ref) (2 pi / 4 N) f_c / (t_last - t_ref), if it saw an edge
//              ref: the last edge of the previous evaluation. Speed in rad/s, mechanical; t in counts
//
// Both times err by less than a count, so at constant speed the relative error is below 1 / (t_last - t_ref),
// about 2 / (f_c window), since those edges are never closer than half a window. The value is the mean over
// the window, so it lags.
// No edge in the window: the value holds, but not above one edge over the silence so far; zero from timeout on.
// The first window with edges after such a silence has no reference: its own first edge serves, and one edge
// alone tells nothing.
// Reversal: an edge has one place whichever way it is crossed (the decoder knows the way), so a window with a
// reversal gives its mean speed, signed as the net motion; a shaft that trembles about one edge gives zero.
// Source: T. Ohmae, T. Matsuda, K. Kamiyama, M. Tachikawa, "A microprocessor-controlled high-accuracy
// wide-range speed regulator for motor drives", IEEE Trans. Ind. Electron. IE-29(3), 1982, 207-211 (from
// memory); the rules for silence and reversal are our own.
//
// Edge numbers and clock counts are whole numbers held in Real, exact up to 2^53 (28 years at 10 MHz): over
// double only, lanes of it included; float would lose counts within two seconds.
#pragma once

#include <cstdint>
#include <type_traits>

#include "plant/math/fields.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

struct EncoderData {
  std::int64_t lines_per_rev = 1024;
  double clock_Hz = 10e6;
  double timeout_s = 0.1;
};

template <class Real>
struct Encoder {
  Real edges_per_rad{};
  Real counts_per_step{};  // clock counts in a plant step
  Real speed_factor{};     // rad/s of one edge in one count
  Real timeout{};          // counts
  SLIPBENCH_FIELDS(edges_per_rad, counts_per_step, speed_factor, timeout)
};

template <class Real>
struct EncoderState {
  Real first_edge{}, first_time{};  // first of this window; times in counts
  Real last_edge{}, last_time{};
  Real reference_edge{}, reference_time{};
  Real has_reference{};  // 1 or 0
  Real moved{};          // edges passed in this window, either way
  Real speed{};          // rad/s, held between evaluations
  SLIPBENCH_FIELDS(first_edge, first_time, last_edge, last_time, reference_edge, reference_time, has_reference, moved,
                   speed)
};

inline Encoder<double> prepare_encoder(const EncoderData& data, double plant_step_s) {
  constexpr double turn = 6.283185307179586477;
  const double edges = 4.0 * static_cast<double>(data.lines_per_rev);
  return {edges / turn, plant_step_s * data.clock_Hz, turn / edges * data.clock_Hz, data.timeout_s * data.clock_Hz};
}

// As if the shaft had turned at `speed` all along, reaching `angle_rad` after `step` plant steps.
inline EncoderState<double> begin_encoder(const Encoder<double>& c, double angle_rad, double speed_rad_s,
                                          std::int64_t step) {
  const double place = angle_rad * c.edges_per_rad;
  const double counts_per_edge = c.speed_factor / max(fabs(speed_rad_s), 1e-300);
  EncoderState<double> state;
  state.last_edge = speed_rad_s < 0.0 ? floor(place) + 1.0 : floor(place);
  const double silence = fabs(place - state.last_edge) * counts_per_edge;
  const double now = floor(static_cast<double>(step) * c.counts_per_step);
  if (speed_rad_s != 0.0 && silence < c.timeout) {
    state.last_time = now - floor(silence);  // not further back, or the ceiling would cut the speed at once
    state.speed = speed_rad_s;
    state.has_reference = 1.0;
  } else {
    state.last_time = now - c.timeout;
  }
  state.reference_edge = state.last_edge;
  state.reference_time = state.last_time;
  return state;
}

// Plant step `step`, over which the shaft turns from one angle to the other; angles are not wrapped.
template <class Real>
inline void count_edges(EncoderState<Real>& s, const Real& angle_before_rad, const Real& angle_after_rad,
                        std::int64_t step, const Encoder<Real>& c) {
  static_assert(std::is_same_v<ScalarOf<Real>, double>);
  const Real zero(0.0), one(1.0);
  const Real before = angle_before_rad * c.edges_per_rad, after = angle_after_rad * c.edges_per_rad;
  const Real cell_before = floor(before), cell_after = floor(after);
  const Real passed = fabs(cell_after - cell_before);
  const auto some = zero < passed;
  const auto forward = cell_before < cell_after;
  const Real first = select(forward, cell_before + one, cell_before);
  const Real last = select(forward, cell_after, cell_after + one);
  // Place k lies in (before, after] or (after, before], so the shares below lie in [0, 1].
  const Real counts_per_edge = c.counts_per_step / select(some, after - before, one);
  const Real start = Real(static_cast<double>(step)) * c.counts_per_step;
  const Real first_time = floor(start + (first - before) * counts_per_edge);
  const Real last_time = floor(start + (last - before) * counts_per_edge);
  const auto new_window = s.moved == zero;
  s.first_edge = select(some, select(new_window, first, s.first_edge), s.first_edge);
  s.first_time = select(some, select(new_window, first_time, s.first_time), s.first_time);
  s.last_edge = select(some, last, s.last_edge);
  s.last_time = select(some, last_time, s.last_time);
  s.moved = s.moved + passed;
}

// Ends a window at plant step `step` (the number of steps taken) and gives the new speed.
template <class Real>
inline Real end_window(EncoderState<Real>& s, std::int64_t step, const Encoder<Real>& c) {
  const Real zero(0.0), one(1.0);
  const auto some = zero < s.moved;
  const auto referred = zero < s.has_reference;
  const Real from_edge = select(referred, s.reference_edge, s.first_edge);
  const Real from_time = select(referred, s.reference_time, s.first_time);
  const Real measured = c.speed_factor * (s.last_edge - from_edge) / max(s.last_time - from_time, one);

  const Real silence = Real(static_cast<double>(step)) * c.counts_per_step - s.last_time;
  const Real ceiling = c.speed_factor / max(silence, one);
  const auto timed_out = c.timeout <= silence;
  const Real held = select(timed_out, zero, clamp(s.speed, -ceiling, ceiling));

  s.speed = select(some, measured, held);
  s.has_reference = select(some, one, select(timed_out, zero, s.has_reference));
  s.reference_edge = select(some, s.last_edge, s.reference_edge);
  s.reference_time = select(some, s.last_time, s.reference_time);
  s.moved = zero;
  return s.speed;
}

}  // namespace slipbench
