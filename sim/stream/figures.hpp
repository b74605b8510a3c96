// What came of a stream: where it was, who listened, what was lost.
#pragma once

#include <cstdint>
#include <string>

namespace slipbench {

struct StreamFigures {
  std::string endpoint;
  std::int64_t subscribers = 0;                    // most at a time
  std::int64_t blocks = 0, rows = 0, dropped = 0;  // made by the run; dropped: blocks that somebody missed
};

}  // namespace slipbench
