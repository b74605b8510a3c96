#include "sim/score/drive_score.hpp"

#include <cmath>

namespace slipbench {

namespace {
Figure finite(double x) { return std::isfinite(x) ? Figure(x) : Figure(); }
}  // namespace

void DriveScore::control_tick(const TickView& view) {
  if (!basis_.window.holds(view.time_s, basis_.control_period_s)) return;
  const PlantRow& plant = *view.plant;
  count_ += 1;
  const double tracking = plant[P::speed_rpm] - plant[P::speed_reference_rpm];
  tracking_square_ += tracking * tracking;
  clipped_ += view.clipped ? 1.0 : 0.0;
  const double current_square = plant[P::i_alpha] * plant[P::i_alpha] + plant[P::i_beta] * plant[P::i_beta];
  if (!(current_square <= peak_square_)) peak_square_ = current_square;
  const double off_mean = plant[P::torque] - torque_mean_;
  torque_mean_ += off_mean / count_;
  torque_square_ += off_mean * (plant[P::torque] - torque_mean_);
  loss_sum_ += copper_loss(plant, view.time_s);
  watch_load_steps(plant, view.time_s);
}

double DriveScore::copper_loss(const PlantRow& plant, double time_s) {
  const double L_m = basis_.circuit.magnetizing_inductance * basis_.magnetizing_factor.line_at(time_s).at(time_s);
  const double L_r = L_m + basis_.circuit.rotor_leakage * basis_.rotor_leakage_factor.line_at(time_s).at(time_s);
  const double i_d = plant[P::i_d], i_q = plant[P::i_q];
  const double rotor_d = (plant[P::rotor_flux] - L_m * i_d) / L_r, rotor_q = -L_m * i_q / L_r;
  return 1.5 * (plant[P::stator_resistance] * (i_d * i_d + i_q * i_q) +
                plant[P::rotor_resistance] * (rotor_d * rotor_d + rotor_q * rotor_q));
}

void DriveScore::watch_load_steps(const PlantRow& plant, double time_s) {
  const double slack = 1e-6 * basis_.control_period_s;
  const double speed = plant[P::speed_rpm], reference = plant[P::speed_reference_rpm];
  bool stepped = false;
  for (; next_step_ < basis_.load_steps_s.size() && basis_.load_steps_s[next_step_] <= time_s + slack; ++next_step_) {
    stepped |= basis_.load_steps_s[next_step_] >= basis_.window.from_s - slack;
  }
  if (stepped) {
    if (!watches_.empty()) watches_.back().open = false;
    watches_.push_back({basis_.load_steps_s[next_step_ - 1], reference, speed, 0.0, true, {}});
  }
  if (watches_.empty() || !watches_.back().open) return;
  Watch& w = watches_.back();
  const bool referred = !std::isnan(w.reference_rpm);
  if (referred && reference != w.reference_rpm) {
    w.open = false;
    return;
  }
  const double off = std::fabs(speed - (referred ? reference : w.start_rpm));
  if (!(off <= w.dip_rpm)) w.dip_rpm = off;
  if (referred && off <= basis_.settled_error * basis_.rated_speed_rpm) {
    if (!w.recovered_at_s) w.recovered_at_s = time_s;
  } else {
    w.recovered_at_s.reset();
  }
}

DriveFigures DriveScore::figures() const {
  DriveFigures f;
  if (count_ == 0) return f;
  f.speed_tracking_rmse_rpm = finite(std::sqrt(tracking_square_ / count_));
  f.peak_current_A = finite(std::sqrt(peak_square_));
  f.torque_ripple_Nm = finite(std::sqrt(torque_square_ / count_));
  f.copper_loss_W = finite(loss_sum_ / count_);
  if (basis_.has_controller) f.voltage_clipped_fraction = clipped_ / count_;
  if (watches_.empty()) return f;
  double dip = 0.0, recovery = 0.0;
  bool all_recovered = true;
  for (const Watch& w : watches_) {
    if (!(w.dip_rpm <= dip)) dip = w.dip_rpm;
    all_recovered &= w.recovered_at_s.has_value();
    if (w.recovered_at_s && *w.recovered_at_s - w.start_s > recovery) recovery = *w.recovered_at_s - w.start_s;
  }
  f.load_dip_rpm = finite(dip);
  if (all_recovered) f.recovery_s = finite(recovery);
  return f;
}

}  // namespace slipbench
