// Bytes to a controller board and back: two file descriptors, and the process at their other end if it was started here.
//
// One thread. Nothing here throws once a link is open: a peer that is gone shows in closed().
#pragma once

#include <sys/types.h>

#include <chrono>
#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

namespace slipbench {

using LinkClock = std::chrono::steady_clock;

class Link {
 public:
  // Takes both descriptors (they may be one and the same), the child, 0 for none, and the file that its standard error goes to, -1 for none.
  Link(int from_board, int to_board, pid_t child, std::string name, int said = -1);
  // Closes; a child that does not end within half a second of that is killed, with its process group, which is its own.
  ~Link();
  Link(const Link&) = delete;
  Link& operator=(const Link&) = delete;

  // False when they could not be handed over within 0.1 s, or the board is gone.
  bool send(std::span<const std::uint8_t> bytes);
  // What has come, at least one byte; empty when nothing came until the deadline or the board is gone.
  std::span<const std::uint8_t> receive(LinkClock::time_point deadline);

  [[nodiscard]] bool closed() const { return closed_; }
  [[nodiscard]] const std::string& why() const { return why_; }    // "its process ended with status 4"
  [[nodiscard]] const std::string& name() const { return name_; }  // "pipe:./my_board"

 private:
  void gone(const char* what);
  [[nodiscard]] std::string last_said() const;
  bool reap(std::chrono::milliseconds patience);
  void close_descriptors();

  int in_, out_, said_;
  pid_t child_;
  std::string name_, why_;
  bool closed_ = false;
  std::vector<std::uint8_t> buffer_;
};

}  // namespace slipbench
