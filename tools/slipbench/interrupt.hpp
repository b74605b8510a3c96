// Ctrl-C: the first one asks the run to stop and keeps what was done, the second one ends the program at once.
#pragma once

namespace slipbench {

void catch_interrupts();
[[nodiscard]] bool interrupted();

}  // namespace slipbench
