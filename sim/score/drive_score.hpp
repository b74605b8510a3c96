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
#include "sim/score/basis.hpp"
#include "sim/score/figures.hpp"

namespace slipbench {

class DriveScore : public RunObserver {
 public:
  explicit DriveScore(ScoreBasis basis) : basis_(std::move(basis)) {}
  void control_tick(const TickView& view) override;
  [[nodiscard]] DriveFigures figures() const;

 private:
  struct Watch {  // one load step
    double start_s = 0, reference_rpm = 0, start_rpm = 0, dip_rpm = 0;
    bool open = false;
    Figure recovered_at_s;
  };
  void watch_load_steps(const PlantRow& plant, double time_s);
  [[nodiscard]] double copper_loss(const PlantRow& plant, double time_s);

  ScoreBasis basis_;
  std::vector<Watch> watches_;
  std::size_t next_step_ = 0;
  double count_ = 0, tracking_square_ = 0, clipped_ = 0, loss_sum_ = 0, peak_square_ = 0;
  double torque_mean_ = 0, torque_square_ = 0;  // running mean and sum of squares about it (Welford)
};

}  // namespace slipbench
