// How well the drive itself did, over the score window at every control tick (N of them).
//
//   speed_tracking_rmse_rpm   sqrt(mean (n - n_ref)^2); empty without a speed reference
//   peak_current_A            largest |i_s|, which is the peak phase current of that vector
//   torque_ripple_Nm          sqrt(mean (T - mean T)^2): rms about the mean, so a steady window is asked for
//   copper_loss_W             mean 3/2 (R_s |i_s|^2 + R_r |i_r|^2), i_r = (psi_r - L_m i_s) / L_r in rotor-flux axes,
//                             resistances and inductances those of the true machine at that tick (T form)
//   voltage_clipped_fraction  share of ticks at which the voltage limit acted; empty without a controller
// A load step is a jump of a `profile` load inside the window. It is watched from its tick until the next load step,
// until the speed reference leaves the value it had at the step, or until the window's end:
//   load_dip_rpm              largest |n - n_ref| watched after any step (no reference: |n - n at the step|)
//   recovery_s                from the step until |n - n_ref| stays within settled_error x rated speed for the rest of
//                             the watch; the longest of all steps, empty if one is not recovered or without a reference
#pragma once

#include "sim/engine/observer.hpp"
#include "sim/score/drive_tally.hpp"

namespace slipbench {

class DriveScore : public RunObserver {
 public:
  explicit DriveScore(const ScoreBasis& basis) : DriveScore(&basis) {}
  void control_tick(const TickView& view) override;
  [[nodiscard]] DriveFigures figures() const { return tally_.figures(0); }

 private:
  explicit DriveScore(const ScoreBasis* alone) : limits_({&alone, 1}), tally_({&alone, 1}) {}

  ScoreLimits<double> limits_;
  DriveTally<double> tally_;
};

}  // namespace slipbench
