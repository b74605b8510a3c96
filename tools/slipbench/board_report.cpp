// The board's part of a summary: who it was, what came and what did not, and the control periods its link allows.
#include <fmt/format.h>

#include "sim/board/budget.hpp"
#include "tools/slipbench/run_result.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

std::string refused(const ExchangeFigures& f) {
  std::string text;
  const auto add = [&](std::uint64_t count, const char* what) {
    if (count > 0) text += fmt::format("{}{} {}", text.empty() ? "" : ", ", count, what);
  };
  add(f.missing, "missing");
  add(f.damaged, "damaged");
  add(f.late, "late");
  add(f.doubled, "doubled");
  add(f.strange, "strange");
  add(f.restarts, "restarts of the board");
  return text.empty() ? "none missing, damaged, late or doubled" : text;
}

}  // namespace

std::string board_summary(const BoardResult& b) {
  const ExchangeFigures& f = b.exchange;
  std::string text = fmt::format("'{}' on {}\n", b.name, b.link);
  text += fmt::format("{} of {} samples answered; {}\n", f.answers, f.samples, refused(f));
  if (f.answers == 0) return text;
  if (b.outcome.faulted) text += fmt::format("fault {} of the board at the end, gates open\n", b.outcome.fault);
  if (!b.used_unit.empty()) {
    text += fmt::format("a tick costs the board {} to {} {}, {} in the mean\n", f.used_least, f.used_most, b.used_unit,
                        significant(f.used_mean, 5));
  }
  text += fmt::format("an exchange took {} us (half of them), {} us (99 %), {} us (longest)\n",
                      significant(f.round_trip_p50_us, 3), significant(f.round_trip_p99_us, 3),
                      significant(f.round_trip_max_us, 3));
  text +=
      fmt::format("shortest control period of this link on this computer: {} us for half the ticks, {} us for 99 %\n",
                  significant(f.round_trip_p50_us, 3), significant(f.round_trip_p99_us, 3));
  const std::size_t bytes = sample_wire_bytes + answer_wire_bytes;
  if (b.baud > 0.0) {
    text += fmt::format("{} bytes an exchange at {} baud take {} us of the line alone\n", bytes, b.baud,
                        significant(1e6 * serial_exchange_s(b.baud), 3));
  }
  text += fmt::format("a serial line carries an exchange ({} bytes) in a control period of {} us from {} megabaud on\n",
                      bytes, significant(1e6 * b.control_period_s, 3),
                      significant(1e-6 * baud_wanted(b.control_period_s), 3));
  return text;
}

}  // namespace slipbench
