// A controller outside the simulation, a board: what it is told at a control tick, and what it answers.
//
// It stands in for the scenario's controller, and its estimates are those of one more estimator, named `board`, the last in every
// list. What it commands is stamped with the tick that asked for it: gates act at that tick, duties delay_periods later, as those of a
// controller inside do.
#pragma once

#include <cstdint>
#include <span>
#include <string_view>
#include <vector>

#include "estimators/sample.hpp"
#include "plant/math/frames.hpp"
#include "sim/engine/events.hpp"

namespace slipbench {

inline constexpr std::string_view outside_name = "board";  // of the estimator, and its kind

struct OutsideView {
  std::int64_t tick = 0;
  std::span<const double> readings;  // as the measured columns: phase currents A, DC link V, ...
  double encoder_edges = 0.0;        // counted so far; a whole number
  double speed_reference_rad_s = 0.0, torque_reference_Nm = 0.0;  // 0 for the one that is not followed
  bool gates = true;                                              // enabled
};

struct OutsideAct {
  Phases<double> duty{0.5, 0.5, 0.5};  // 0..1
  bool gates = true;                   // false: all switches open from this tick on
  bool clipped = false;                // a duty is at its end
  Estimate<double> estimate;           // at this tick
};

class OutsideController {
 public:
  virtual ~OutsideController() = default;
  // Called once a control tick, from tick 0 on. Never throws; may wait.
  virtual OutsideAct step(const OutsideView& view) = 0;
  // What is to stand among the run's events, in order of ticks.
  [[nodiscard]] virtual std::vector<ActedEvent> events() const = 0;
};

}  // namespace slipbench
