// A board as the engine's outside controller: readings to converter codes, codes to duties, and the watchdog.
//
// A missing answer: the duties that stood are commanded again and the estimates held. After `watchdog` of them in a row, or a
// tick at which the board is gone, the gates open and stay open, the estimates are NaN from there on and the board is told the end.
// A board that opens its gates itself may enable them again.
#pragma once

#include <string>
#include <vector>

#include "sim/board/exchange.hpp"
#include "sim/engine/outside.hpp"

namespace slipbench {

struct BoardOutcome {
  bool lost = false;              // the watchdog opened the gates
  bool gone = false;              // because the board had closed the link or ended
  bool faulted = false;           // at the end the gates are open, and the board names a fault
  std::int64_t opened_tick = -1;  // of the watchdog
  std::string why;                // of a board that is gone
  int fault = 0;
};

class BoardInLoop final : public OutsideController {
 public:
  BoardInLoop(AnswerSource& source, const board_hello& hello, double control_period_s, unsigned watchdog);

  OutsideAct step(const OutsideView& view) override;
  [[nodiscard]] std::vector<ActedEvent> events() const override { return events_; }
  [[nodiscard]] const BoardOutcome& outcome() const { return outcome_; }

 private:
  [[nodiscard]] board_sample sample_of(const OutsideView& view) const;
  void take(const board_answer& answer, std::int64_t tick);
  void open_for_good(std::int64_t tick);
  void note(std::int64_t tick, std::string what);

  AnswerSource& source_;
  board_hello hello_;
  double period_s_, current_lsb_, dc_link_lsb_;
  unsigned watchdog_, missing_in_a_row_ = 0;
  OutsideAct act_;
  bool begun_ = false;
  BoardOutcome outcome_;
  std::vector<ActedEvent> events_;
};

}  // namespace slipbench
