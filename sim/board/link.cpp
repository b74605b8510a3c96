#include "sim/board/link.hpp"

#include <fcntl.h>
#include <poll.h>
#include <sys/wait.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <csignal>
#include <cstring>
#include <thread>

namespace slipbench {

namespace {

using namespace std::chrono_literals;

// Waits until the descriptor is ready; false when the deadline passes first.
bool ready(int descriptor, short what, LinkClock::time_point deadline) {
  for (;;) {
    const auto left = std::chrono::duration_cast<std::chrono::nanoseconds>(deadline - LinkClock::now()).count();
    const timespec wait = {left > 0 ? static_cast<time_t>(left / 1000000000) : 0, left > 0 ? left % 1000000000 : 0};
    pollfd one = {descriptor, what, 0};
    const int found = ppoll(&one, 1, &wait, nullptr);
    if (found > 0) return true;
    if (found == 0 || errno != EINTR) return false;
    if (LinkClock::now() >= deadline) return false;
  }
}

}  // namespace

Link::Link(int from_board, int to_board, pid_t child, std::string name, int said)
    : in_(from_board), out_(to_board), said_(said), child_(child), name_(std::move(name)), buffer_(4096) {
  for (const int descriptor : {in_, out_}) fcntl(descriptor, F_SETFL, fcntl(descriptor, F_GETFL) | O_NONBLOCK);
}

void Link::close_descriptors() {
  if (in_ >= 0) close(in_);
  if (out_ >= 0 && out_ != in_) close(out_);
  if (said_ >= 0) close(said_);
  in_ = out_ = said_ = -1;
}

Link::~Link() {
  close_descriptors();
  if (child_ > 0 && !reap(500ms)) {
    kill(-child_, SIGKILL);
    waitpid(child_, nullptr, 0);
  }
}

bool Link::reap(std::chrono::milliseconds patience) {
  const auto until = LinkClock::now() + patience;
  for (;;) {
    int status = 0;
    const pid_t ended = waitpid(child_, &status, WNOHANG);
    if (ended == child_) {
      child_ = 0;
      why_ = WIFSIGNALED(status) ? "its process was killed by signal " + std::to_string(WTERMSIG(status))
                                 : "its process ended with status " + std::to_string(WEXITSTATUS(status));
      return true;
    }
    if (ended < 0 && errno != EINTR) return true;
    if (LinkClock::now() >= until) return false;
    std::this_thread::sleep_for(2ms);
  }
}

void Link::gone(const char* what) {
  closed_ = true;
  why_ = what;
  if (child_ > 0) reap(300ms);
  if (const std::string last = last_said(); !last.empty()) why_ += "; it said: " + last;
}

// The last line.
std::string Link::last_said() const {
  std::string text(4096, '\0');
  const off_t end = said_ >= 0 ? lseek(said_, 0, SEEK_END) : 0;
  const ssize_t length = end > 0 ? pread(said_, text.data(), text.size(), std::max<off_t>(0, end - 4096)) : 0;
  text.resize(static_cast<std::size_t>(std::max<ssize_t>(length, 0)));
  while (!text.empty() && text.back() == '\n') text.pop_back();
  const std::string last = text.substr(text.rfind('\n') + 1);
  return last.ends_with("has no peer") ? "" : last;  // QEMU always warns so of a network card
}

bool Link::send(std::span<const std::uint8_t> bytes) {
  const auto until = LinkClock::now() + 100ms;
  while (!bytes.empty() && !closed_) {
    const ssize_t taken = write(out_, bytes.data(), bytes.size());
    if (taken > 0) {
      bytes = bytes.subspan(static_cast<std::size_t>(taken));
    } else if (errno == EAGAIN) {
      if (!ready(out_, POLLOUT, until)) return false;
    } else if (errno != EINTR) {
      gone(std::strerror(errno));
    }
  }
  return !closed_;
}

std::span<const std::uint8_t> Link::receive(LinkClock::time_point deadline) {
  while (!closed_ && ready(in_, POLLIN, deadline)) {
    const ssize_t came = read(in_, buffer_.data(), buffer_.size());
    if (came > 0) return {buffer_.data(), static_cast<std::size_t>(came)};
    if (came == 0) {
      gone("it closed the link");
    } else if (errno != EAGAIN && errno != EINTR) {
      gone(errno == EIO ? "the serial line hung up" : std::strerror(errno));
    }
  }
  return {};
}

}  // namespace slipbench
