// Progress and time left on standard error: only for what takes over two seconds, and only on a terminal or when asked.
#pragma once

#include <chrono>
#include <mutex>
#include <string>

namespace slipbench {

class Progress {
 public:
  // asked: show even if standard error is no terminal (then a line every few seconds).
  Progress(std::string what, bool asked, bool quiet);
  ~Progress();
  // 0..1; from any thread. `more`: said behind it.
  void update(double share_done, const std::string& more = "");

 private:
  using Clock = std::chrono::steady_clock;
  std::string what_;
  bool terminal_ = false, shown_ = false, active_ = false;
  Clock::time_point begun_ = Clock::now(), last_ = begun_;
  std::mutex mutex_;
};

}  // namespace slipbench
