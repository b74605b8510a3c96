// The order of things in a run: control ticks, trace rows and plant steps from t = 0 to the end.
//
// A host gives, in the order of their calls at one plant step n:
//   act(k)          control tick k acts
//   look(n)         the row at n will be told
//   tell_tick(k)    false ends the run
//   tell_row(r)     trace row r
//   step(n)         from n to n + 1
#pragma once

#include <limits>

#include "sim/engine/setup.hpp"

namespace slipbench {

class RunClock {
 public:
  // For at most so many control ticks more; true: the run has ended.
  template <class Host>
  bool go(const RunShape& shape, Host&& host, std::int64_t ticks) {
    for (;; ++n_, --to_control_, --to_trace_) {
      const bool control = to_control_ == 0, trace = to_trace_ == 0;
      if (control) {
        if (ticks-- == 0) return false;
        to_control_ = shape.steps_per_control;
        host.act(++k_);
      }
      if (trace) {
        to_trace_ = shape.steps_per_trace;
        ++rows_;
      }
      if (control || trace) host.look(n_);
      if (control && !host.tell_tick(k_)) return true;
      if (trace) host.tell_row(rows_);
      if (n_ == shape.steps) return true;
      host.step(n_);
    }
  }
  [[nodiscard]] std::int64_t step() const { return n_; }  // where the run stands

 private:
  // Counted down, since dividing costs as much as a stage.
  std::int64_t k_ = -1, rows_ = -1, to_control_ = 0, to_trace_ = 0, n_ = 0;
};

// Returns the plant step at which the run ended.
template <class Host>
std::int64_t run_clock(const RunShape& shape, Host&& host) {
  RunClock clock;
  clock.go(shape, host, std::numeric_limits<std::int64_t>::max());
  return clock.step();
}

}  // namespace slipbench
