// The state of a sensor; sensors.hpp says what each means.
#pragma once

namespace slipbench {

enum class Fault { none, no_signal, stuck };  // none: healthy, or repaired

}  // namespace slipbench
