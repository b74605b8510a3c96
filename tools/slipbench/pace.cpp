#include "tools/slipbench/pace.hpp"

#include <algorithm>
#include <thread>

#include "tools/slipbench/interrupt.hpp"

namespace slipbench {

void Pace::hold(double time_s) {
  using std::chrono::milliseconds;
  next_s_ = time_s + 2e-3 * factor_;                      // a look at the clock every 2 ms of wall time
  const double wall_s = std::min(time_s / factor_, 1e9);  // a clock of nanoseconds holds no more than 292 years
  const auto due = begun_ + std::chrono::duration_cast<Clock::duration>(std::chrono::duration<double>(wall_s));
  auto now = Clock::now();
  if (now > due + milliseconds(50)) begun_ += now - due;  // held up: what was lost is not caught up in a rush
  for (; now < due && !interrupted(); now = Clock::now()) {
    std::this_thread::sleep_for(std::min<Clock::duration>(due - now, milliseconds(20)));
  }
}

}  // namespace slipbench
