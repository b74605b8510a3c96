#include "tools/slipbench/progress.hpp"

#include <fmt/format.h>
#include <unistd.h>

#include <cstdio>

namespace slipbench {

namespace {

std::string time_left(double seconds) {
  const auto whole = static_cast<long long>(seconds + 0.5);
  if (whole < 60) return fmt::format("{} s", whole);
  if (whole < 3600) return fmt::format("{} min {:02} s", whole / 60, whole % 60);
  return fmt::format("{} h {:02} min", whole / 3600, whole / 60 % 60);
}

}  // namespace

Progress::Progress(std::string what, bool asked, bool quiet) : what_(std::move(what)) {
  terminal_ = ::isatty(STDERR_FILENO) == 1;
  active_ = asked || (terminal_ && !quiet);
}

Progress::~Progress() {
  if (shown_ && terminal_) std::fputs("\r\033[K", stderr);
}

void Progress::update(double share_done, const std::string& more) {
  if (!active_) return;
  const std::unique_lock lock(mutex_, std::try_to_lock);
  if (!lock.owns_lock()) return;
  const auto now = Clock::now();
  const double elapsed = std::chrono::duration<double>(now - begun_).count();
  const double since = std::chrono::duration<double>(now - last_).count();
  if (elapsed < 0.5 || since < (terminal_ ? 0.2 : shown_ ? 2.0 : 0.0) || share_done <= 0.0) return;
  const double left = elapsed * (1.0 - share_done) / share_done;
  if (!shown_ && elapsed + left < 2.0) return;
  const std::string line = fmt::format("{}: {:3.0f} %, {} left{}", what_, 100.0 * share_done, time_left(left), more);
  std::fputs(terminal_ ? ("\r\033[K" + line).c_str() : (line + "\n").c_str(), stderr);
  std::fflush(stderr);
  shown_ = true;
  last_ = now;
}

}  // namespace slipbench
