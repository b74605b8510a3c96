#include "sim/linear/frequency_lines.hpp"

#include "sim/engine/plant_row.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {

FrequencyLines frequency_lines(const Plane& plane, const FluxRule& flux, double blind_below_Hz) {
  if (!(blind_below_Hz > 0.0 && blind_below_Hz < 1e3))
    throw InputError("", "blind_below_Hz", "blind_below_Hz must lie above 0 and below 1000 Hz", "map");
  FrequencyLines lines;
  lines.blind_below_Hz = blind_below_Hz;
  const double w = 6.28318530717958647693 * blind_below_Hz;
  for (std::size_t k = 0; k < plane.torques; ++k) {
    const double torque = plane.torque_Nm(k);
    const auto at = [&](double w_s) { return PlanePoint{flux.speed_at_frequency(torque, w_s) / rad_s_in_rpm, torque}; };
    lines.lost.push_back(at(0.0));
    lines.blind_from.push_back(at(-w));
    lines.blind_to.push_back(at(w));
  }
  return lines;
}

}  // namespace slipbench
