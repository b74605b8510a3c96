#include "sim/board/in_loop.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace slipbench {

namespace {

constexpr std::size_t most_events = 1000;  // a board that keeps toggling its gates fills no memory

double lsb(float range, unsigned bits) { return std::ldexp(static_cast<double>(range), 1 - static_cast<int>(bits)); }

std::int16_t code_of(double reading, double lsb) {
  return static_cast<std::int16_t>(std::clamp(std::floor(reading / lsb + 0.5), -32768.0, 32767.0));
}

Estimate<double> blind() {
  Estimate<double> e;
  e.speed = e.rotor_flux = e.rotor_flux_angle = e.torque = std::numeric_limits<double>::quiet_NaN();
  e.trust = 0.0;
  return e;
}

}  // namespace

BoardInLoop::BoardInLoop(AnswerSource& source, const board_hello& hello, double control_period_s, unsigned watchdog)
    : source_(source),
      hello_(hello),
      period_s_(control_period_s),
      current_lsb_(lsb(hello.current_range_A, hello.current_bits)),
      dc_link_lsb_(lsb(hello.dc_link_range_V, hello.dc_link_bits)),
      watchdog_(watchdog) {
  act_.gates = false;  // until the board enables them
  act_.estimate = blind();
}

board_sample BoardInLoop::sample_of(const OutsideView& view) const {
  board_sample s{};
  s.tick = static_cast<std::uint32_t>(view.tick);
  s.gates = act_.gates ? 1 : 0;
  for (std::size_t i = 0; i < hello_.currents; ++i) s.current[i] = code_of(view.readings[i], current_lsb_);
  s.dc_link = code_of(view.readings[hello_.currents], dc_link_lsb_);
  if (hello_.encoder_edges > 0)
    s.encoder = static_cast<std::uint32_t>(static_cast<std::uint64_t>(static_cast<std::int64_t>(view.encoder_edges)));
  s.speed_reference_rad_s = static_cast<float>(view.speed_reference_rad_s);
  s.torque_reference_Nm = static_cast<float>(view.torque_reference_Nm);
  return s;
}

void BoardInLoop::note(std::int64_t tick, std::string what) {
  if (events_.size() < most_events) events_.push_back({tick, static_cast<double>(tick) * period_s_, std::move(what)});
}

void BoardInLoop::take(const board_answer& a, std::int64_t tick) {
  const bool gates = a.gates != 0;
  if (begun_ && gates != act_.gates) {
    note(tick, gates ? "the board enabled the gates"
                     : "the board opened the gates" + (a.fault == 0 ? "" : ", fault " + std::to_string(a.fault)));
  } else if (!begun_ && !gates) {
    note(tick, "the board keeps the gates open");
  }
  begun_ = true;
  outcome_.fault = a.fault;
  outcome_.faulted = !gates && a.fault != 0;
  const double counts = hello_.duty_counts;
  act_.gates = gates;
  act_.duty = {a.duty[0] / counts, a.duty[1] / counts, a.duty[2] / counts};
  act_.clipped = gates && (std::max({a.duty[0], a.duty[1], a.duty[2]}) == hello_.duty_counts ||
                           std::min({a.duty[0], a.duty[1], a.duty[2]}) == 0);
  const auto known = [&](unsigned bit, float x) {
    return (hello_.estimates & bit) != 0 ? static_cast<double>(x) : std::numeric_limits<double>::quiet_NaN();
  };
  Estimate<double>& e = act_.estimate;
  e.speed = known(BOARD_SPEED, a.speed_rad_s);
  e.rotor_flux = known(BOARD_FLUX, a.rotor_flux_Wb);
  e.rotor_flux_angle = known(BOARD_ANGLE, a.rotor_flux_angle_rad);
  e.torque = known(BOARD_TORQUE, a.torque_Nm);
  e.trust = 1.0;
}

void BoardInLoop::open_for_good(std::int64_t tick) {
  outcome_.lost = true;
  outcome_.gone = source_.gone();
  outcome_.opened_tick = tick;
  outcome_.why = source_.why_gone();
  const std::string ticks = missing_in_a_row_ == 1 ? "1 tick" : std::to_string(missing_in_a_row_) + " ticks";
  note(tick, "no answer from the board for " + ticks + (outcome_.gone ? " (" + outcome_.why + ")" : "") +
                 ": gates opened, the drive coasts");
  act_ = OutsideAct{};
  act_.gates = false;
  act_.estimate = blind();
  source_.end();
}

OutsideAct BoardInLoop::step(const OutsideView& view) {
  if (outcome_.lost) return act_;
  board_sample sample = sample_of(view);
  board_answer answer;
  if (source_.step(sample, answer)) {
    missing_in_a_row_ = 0;
    take(answer, view.tick);
  } else if (++missing_in_a_row_ >= watchdog_) {
    open_for_good(view.tick);
  }
  return act_;
}

}  // namespace slipbench
