// What the estimates were worth: figures of each estimator of a run, e = estimate - truth at every control tick.
//
// Over the score window, N ticks:
//   speed_rmse_rpm = sqrt(sum e^2 / N), speed_bias_rpm = sum e / N, speed_max_error_rpm = max |e|
//   flux_rmse_Wb (of the magnitude), torque_rmse_Nm likewise
//   angle_rmse_deg: e wrapped to +-180 degrees; ticks whose true rotor flux is below 10 % of the rated one are left out
//   settled_at_s: time of the first tick of the window from which |e| <= settled_error x rated speed to the window's end
//   lost_at_s: start of the first stretch inside the window with |e| > lost_error x rated speed that lasted lost_for_s; an
//   estimate of speed that is no finite number is lost at once, at any time of the run
// An estimate that is not finite anywhere in the window leaves the figures it enters empty.
#pragma once

#include <vector>

#include "sim/engine/observer.hpp"
#include "sim/score/estimator_tally.hpp"

namespace slipbench {

class EstimatorScore : public RunObserver {
 public:
  explicit EstimatorScore(const ScoreBasis& basis);
  void begin(const RunInfo& info) override { tallies_.assign(info.estimator_names.size(), {}); }
  void control_tick(const TickView& view) override;

  // One entry for each estimator, in file order; at any time after `begin`.
  [[nodiscard]] std::vector<EstimatorFigures> figures() const;

 private:
  ScoreLimits<double> limits_;
  std::vector<EstimatorTally<double>> tallies_;
};

}  // namespace slipbench
