// What may go wrong in a run, in the order of blame.
#pragma once

#include <cstdint>

namespace slipbench {

enum class Lost : std::int32_t { nothing, stator_flux, rotor_flux, speed, speed_estimate, flux_estimate, command };

}  // namespace slipbench
