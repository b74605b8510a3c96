// Another program, run to its end: its exit status and what it printed on either output.
#pragma once

#include <string>
#include <vector>

namespace slipbench {

struct ProgramAnswer {
  int status = -1;  // 128 + signal where one ended it
  bool timed_out = false;
  std::string output;
};

// No shell in between. Killed after `most_seconds`. Throws OutsideError where it cannot be started.
ProgramAnswer run_program(const std::vector<std::string>& arguments, double most_seconds);

bool on_path(const std::string& program);

}  // namespace slipbench
