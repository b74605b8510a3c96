// A board's answers kept in a file, and run again without the board, to the bit.
//
// The file is frames as they stand on the wire: the hello, then every answer that was taken. A tick without one was missing. A
// board that was gone is missing for good in a recording: the same gates open at the same tick.
#pragma once

#include <string>
#include <vector>

#include "sim/board/exchange.hpp"

namespace slipbench {

std::string recorded(const board_hello& hello);
std::string recorded(const board_answer& answer);

class Recording final : public AnswerSource {
 public:
  // Throws InputError (key --link) for a file that cannot be read, is no recording, or is damaged.
  explicit Recording(const std::string& path);

  [[nodiscard]] const board_hello& hello() const { return hello_; }
  bool step(board_sample& sample, board_answer& answer) override;
  void end() override {}
  [[nodiscard]] bool gone() const override { return false; }
  [[nodiscard]] std::string why_gone() const override { return {}; }
  [[nodiscard]] ExchangeFigures figures() const override { return figures_; }

 private:
  board_hello hello_{};
  std::vector<board_answer> answers_;  // in order of ticks
  std::size_t next_ = 0;
  ExchangeFigures figures_;
};

}  // namespace slipbench
