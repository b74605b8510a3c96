// Ctrl-C, `kill`, a terminal that closes: the first asks the run to stop and keeps what was done. A second Ctrl-C ends the program
// at once.
#pragma once

namespace slipbench {

void catch_interrupts();
[[nodiscard]] bool interrupted();

}  // namespace slipbench
