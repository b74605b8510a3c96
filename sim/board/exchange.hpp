// One tick with a board in lock-step: a sample out, its answer in; everything that came but was not that answer is counted.
//
// An answer is taken when its frame is whole, both checks are right, sequence and tick are those of the sample, and no duty is above
// duty_counts. A damaged frame counts as the answer of the tick at once, so that a run with damage is no slower.
#pragma once

#include <array>
#include <chrono>
#include <cstdint>
#include <functional>
#include <string>
#include <vector>

#include "sim/board/frames.h"
#include "sim/board/link.hpp"

namespace slipbench {

struct ExchangeFigures {
  std::uint64_t samples = 0, answers = 0, missing = 0;
  std::uint64_t damaged = 0;                         // frames: no COBS, wrong length, wrong check, a duty that is none
  std::uint64_t late = 0, doubled = 0, strange = 0;  // answers to older samples, first or again; anything else
  std::uint64_t restarts = 0;                        // hellos that nobody asked for
  double round_trip_p50_us = 0.0, round_trip_p99_us = 0.0, round_trip_max_us = 0.0;  // of the answers taken
  std::uint64_t used_least = 0, used_most = 0;                                       // in the board's unit
  double used_mean = 0.0;
};

// Where a tick's answer comes from: a board, or the recording of one.
class AnswerSource {
 public:
  virtual ~AnswerSource() = default;
  // Fills in the sample's sequence. False: the answer is missing. Never throws.
  virtual bool step(board_sample& sample, board_answer& answer) = 0;
  // Tells the board that the run is over.
  virtual void end() = 0;
  [[nodiscard]] virtual bool gone() const = 0;
  [[nodiscard]] virtual std::string why_gone() const = 0;
  [[nodiscard]] virtual ExchangeFigures figures() const = 0;
};

// Times counted in 64 steps an octave (1.1 %), from 1 ns on.
class TimeCounts {
 public:
  void add(double ns);
  [[nodiscard]] double quantile_ns(double share) const;  // upper end of its step
  [[nodiscard]] double most_ns() const { return most_; }

 private:
  std::array<std::uint32_t, 64 * 40> counts_{};
  std::uint64_t all_ = 0;
  double most_ = 0.0;
};

class Exchange final : public AnswerSource {
 public:
  // `keep` is given every answer that is taken.
  Exchange(Link& link, const board_hello& hello, std::chrono::nanoseconds first_answer_within,
           std::chrono::nanoseconds answer_within, std::function<void(const board_answer&)> keep = {});

  bool step(board_sample& sample, board_answer& answer) override;
  void end() override;
  [[nodiscard]] bool gone() const override { return link_.closed(); }
  [[nodiscard]] std::string why_gone() const override { return link_.why(); }
  [[nodiscard]] ExchangeFigures figures() const override;

 private:
  enum class Heard { nothing, answer, damage };
  Heard listen(std::uint8_t byte, const board_sample& sample, board_answer& answer);
  void sort_out(const board_answer& answer);

  Link& link_;
  std::uint16_t duty_counts_, sequence_ = 0;
  std::chrono::nanoseconds first_within_, within_;
  std::function<void(const board_answer&)> keep_;
  board_receiver receiver_{};
  std::vector<bool> answered_;  // by sequence
  ExchangeFigures figures_;
  TimeCounts round_trips_;
  double used_sum_ = 0.0;
};

}  // namespace slipbench
