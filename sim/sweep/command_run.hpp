// A program of the system, run to its end: arguments in, exit status and both outputs out.
#pragma once

#include <string>
#include <vector>

namespace slipbench {

struct CommandOutcome {
  int status = -1;  // 128 + signal where it was killed
  std::string out, err;
};

// Looked up on the PATH. It runs in a process group of its own, so that Ctrl-C at the terminal does not cut it short.
// Throws OutsideError where there is no such program.
CommandOutcome run_command(const std::vector<std::string>& words);

}  // namespace slipbench
