#include "sim/board/exchange.hpp"

#include <algorithm>
#include <cmath>

namespace slipbench {

void TimeCounts::add(double ns) {
  const double step = 64.0 * std::log2(std::max(ns, 1.0));
  ++counts_[std::min(static_cast<std::size_t>(step), counts_.size() - 1)];
  ++all_;
  most_ = std::max(most_, ns);
}

double TimeCounts::quantile_ns(double share) const {
  std::uint64_t seen = 0;
  const auto wanted = static_cast<std::uint64_t>(std::ceil(share * static_cast<double>(all_)));
  for (std::size_t i = 0; i < counts_.size(); ++i) {
    seen += counts_[i];
    if (seen > 0 && seen >= wanted) return std::min(std::exp2(static_cast<double>(i + 1) / 64.0), most_);
  }
  return 0.0;
}

Exchange::Exchange(Link& link, const board_hello& hello, std::chrono::nanoseconds first_answer_within,
                   std::chrono::nanoseconds answer_within, std::function<void(const board_answer&)> keep)
    : link_(link),
      duty_counts_(hello.duty_counts),
      first_within_(first_answer_within),
      within_(answer_within),
      keep_(std::move(keep)),
      answered_(65536) {}

void Exchange::sort_out(const board_answer& answer) {
  const auto back = static_cast<std::uint16_t>(sequence_ - answer.sequence);
  if (back == 0 || back > 0x7fff) {
    ++figures_.strange;
  } else if (answered_[answer.sequence]) {
    ++figures_.doubled;
  } else {
    answered_[answer.sequence] = true;
    ++figures_.late;
  }
}

Exchange::Heard Exchange::listen(std::uint8_t byte, const board_sample& sample, board_answer& answer) {
  std::uint8_t payload[BOARD_PAYLOAD_MAX];
  const auto bad = [&] { return receiver_.bad_stuffing + receiver_.bad_length + receiver_.bad_check; };
  const std::uint32_t bad_before = bad();
  if (board_receive(&receiver_, byte, payload) == 0) {
    if (bad() == bad_before) return Heard::nothing;
    ++figures_.damaged;
    return Heard::damage;
  }
  if (payload[0] == BOARD_HELLO) {
    board_hello hello;
    board_unpack_hello(payload, &hello);
    if (hello.session == 0) ++figures_.restarts;  // else one more hello to our asking
    return Heard::nothing;
  }
  if (payload[0] != BOARD_ANSWER) {
    ++figures_.strange;
    return Heard::nothing;
  }
  board_answer a;
  board_unpack_answer(payload, &a);
  if (a.sequence != sample.sequence || a.tick != sample.tick) {
    sort_out(a);
    return Heard::nothing;
  }
  if (std::max({a.duty[0], a.duty[1], a.duty[2]}) > duty_counts_) {
    ++figures_.damaged;
    return Heard::damage;
  }
  if (answered_[a.sequence]) {
    ++figures_.doubled;
    return Heard::nothing;
  }
  answered_[a.sequence] = true;
  answer = a;
  return Heard::answer;
}

bool Exchange::step(board_sample& sample, board_answer& answer) {
  sample.sequence = sequence_;
  answered_[sequence_] = false;
  std::uint8_t payload[BOARD_PAYLOAD_MAX], wire[BOARD_WIRE_MAX];
  const std::size_t length = board_seal(payload, board_pack_sample(&sample, payload), wire);
  const auto sent = LinkClock::now();
  ++figures_.samples;
  bool heard = false, damaged = false;
  if (link_.send({wire, length})) {
    const auto deadline = sent + (figures_.answers == 0 ? first_within_ : within_);
    while (!heard && !damaged) {
      const auto bytes = link_.receive(deadline);
      if (bytes.empty()) break;
      for (const std::uint8_t byte : bytes) {
        const Heard what = listen(byte, sample, answer);
        heard = heard || what == Heard::answer;
        damaged = damaged || what == Heard::damage;
      }
    }
  }
  ++sequence_;
  if (!heard) {
    ++figures_.missing;
    return false;
  }
  round_trips_.add(std::chrono::duration<double, std::nano>(LinkClock::now() - sent).count());
  figures_.used_least = figures_.answers == 0 ? answer.used : std::min<std::uint64_t>(figures_.used_least, answer.used);
  figures_.used_most = std::max<std::uint64_t>(figures_.used_most, answer.used);
  used_sum_ += answer.used;
  ++figures_.answers;
  if (keep_) keep_(answer);
  return true;
}

void Exchange::end() {
  std::uint8_t payload[BOARD_PAYLOAD_MAX], wire[BOARD_WIRE_MAX];
  link_.send({wire, board_seal(payload, board_pack_end(payload), wire)});
}

ExchangeFigures Exchange::figures() const {
  ExchangeFigures f = figures_;
  f.round_trip_p50_us = 1e-3 * round_trips_.quantile_ns(0.5);
  f.round_trip_p99_us = 1e-3 * round_trips_.quantile_ns(0.99);
  f.round_trip_max_us = 1e-3 * round_trips_.most_ns();
  f.used_mean = f.answers > 0 ? used_sum_ / static_cast<double>(f.answers) : 0.0;
  return f;
}

}  // namespace slipbench
