// A machine for the tests of number types; any plausible one serves. Numbers invented, of the size of a 4 kW machine.
#pragma once

#include "sim/engine/lanes/machine_step.hpp"

namespace slipbench {

inline MachineOnVoltage<double> test_machine() {
  const Circuit<double> circuit{2.0, 1.4, 1.3, 0.006, 0.008, 0.17};
  return {make_machine(circuit), 1.0 / 0.013, 12.0, {310.0, 20.0}};
}
inline constexpr MachineState<double> test_state{0.7, -0.6, 0.5, -0.8, 130.0};

}  // namespace slipbench
