#include "tools/slipbench/interrupt.hpp"

#include <atomic>
#include <csignal>

namespace slipbench {

namespace {

std::atomic<bool> asked{false};
static_assert(std::atomic<bool>::is_always_lock_free, "a signal handler may touch lock-free atomics only");

void on_interrupt(int signal) {
  asked.store(true);
  // `timeout` and closing terminals signal twice.
  if (signal == SIGINT) std::signal(SIGINT, SIG_DFL);
}

}  // namespace

void catch_interrupts() {
  std::signal(SIGINT, on_interrupt);
  std::signal(SIGTERM, on_interrupt);
  if (std::signal(SIGHUP, on_interrupt) == SIG_IGN) std::signal(SIGHUP, SIG_IGN);  // nohup
}
bool interrupted() { return asked.load(); }

}  // namespace slipbench
