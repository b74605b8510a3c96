// The order of things in a run: control ticks, trace rows and plant steps from t = 0 to the end.
//
// A host gives, in the order of their calls at one plant step n:
//   act(k)          control tick k acts
//   look(n)         the row at n will be told
//   tell_tick(k)    false ends the run
//   tell_row(r)     trace row r
//   step(n)         from n to n + 1
#pragma once

#include "sim/engine/setup.hpp"

namespace slipbench {

// Returns the plant step at which the run ended.
template <class Host>
std::int64_t run_clock(const RunShape& shape, Host&& host) {
  // Counted down, since dividing costs as much as a stage.
  std::int64_t k = -1, rows = -1, to_control = 0, to_trace = 0, n = 0;
  for (;; ++n, --to_control, --to_trace) {
    const bool control = to_control == 0, trace = to_trace == 0;
    if (control) {
      to_control = shape.steps_per_control;
      host.act(++k);
    }
    if (trace) {
      to_trace = shape.steps_per_trace;
      ++rows;
    }
    if (control || trace) host.look(n);
    if (control && !host.tell_tick(k)) break;
    if (trace) host.tell_row(rows);
    if (n == shape.steps) break;
    host.step(n);
  }
  return n;
}

}  // namespace slipbench
