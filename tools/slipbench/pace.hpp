// An observer that lets a run go no faster than FACTOR times real time, so that it can be watched.
#pragma once

#include <chrono>

#include "sim/engine/observer.hpp"

namespace slipbench {

class Pace : public RunObserver {
 public:
  explicit Pace(double factor) : factor_(factor) {}
  void begin(const RunInfo&) override { begun_ = Clock::now(); }
  void control_tick(const TickView& tick) override {
    if (tick.time_s >= next_s_) hold(tick.time_s);
  }

 private:
  using Clock = std::chrono::steady_clock;
  void hold(double time_s);  // sleeps until it is time; an interrupt ends that

  double factor_, next_s_ = 0.0;
  Clock::time_point begun_;
};

}  // namespace slipbench
