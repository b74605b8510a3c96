#include "sim/score/drive_score.hpp"

namespace slipbench {

void DriveScore::control_tick(const TickView& view) {
  if (!limits_.in_window(view.time_s)) return;
  const auto column = [&](P which) { return (*view.plant)[which]; };
  tally_.judge(limits_, true, column, view.clipped, view.time_s);
}

}  // namespace slipbench
