// Instructions as time: a clock and a band of clocks per instruction.
#pragma once

namespace slipbench {

// 1.0: never less on a Cortex-M4F; 2.5: divisions, stalls and a flash that makes the core wait (common practice, to be measured).
struct ClockBand {
  double clock_MHz = 100.0;
  double least = 1.0, most = 2.5;  // clocks per instruction
  [[nodiscard]] double least_us(double instructions) const { return instructions * least / clock_MHz; }
  [[nodiscard]] double most_us(double instructions) const { return instructions * most / clock_MHz; }
};

}  // namespace slipbench
