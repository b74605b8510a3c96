#include "sim/score/estimator_score.hpp"

#include <cmath>

namespace slipbench {

namespace {

constexpr double pi = 3.14159265358979323846;

// To [-180, 180): a figure, not a state, so the turn taken off need not be exact to the last bit.
double wrapped_degrees(double angle_rad) {
  const double turns = angle_rad * (0.5 / pi);
  return 360.0 * (turns - std::floor(turns + 0.5));
}

Figure finite(double x) { return std::isfinite(x) ? Figure(x) : Figure(); }
Figure root_mean(double sum_of_squares, double count) {
  return count > 0 ? finite(std::sqrt(sum_of_squares / count)) : Figure();
}

}  // namespace

void EstimatorScore::control_tick(const TickView& view) {
  for (std::size_t i = 0; i < tallies_.size() && i < view.estimates.size(); ++i) {
    judge(tallies_[i], *view.plant, view.estimates[i], view.time_s);
  }
}

void EstimatorScore::judge(Tally& t, const PlantRow& plant, const Estimate<double>& estimate, double time_s) const {
  const double speed_error = estimate.speed * (30.0 / pi) - plant[P::speed_rpm];
  const double size = std::fabs(speed_error);

  const bool in_window = basis_.window.holds(time_s, basis_.control_period_s);

  // A NaN compares false with everything, so that "within" is asked for, never "beyond".
  if (!t.lost_at) {
    if (!std::isfinite(speed_error)) {
      t.lost_at = t.off_since ? t.off_since : Figure(time_s);
    } else if (!in_window || size <= basis_.lost_error * basis_.rated_speed_rpm) {
      t.off_since.reset();
    } else {
      if (!t.off_since) t.off_since = time_s;
      if (time_s - *t.off_since >= basis_.lost_for_s - 1e-6 * basis_.control_period_s) t.lost_at = t.off_since;
    }
  }
  if (!in_window) return;

  t.count += 1;
  t.speed_sum += speed_error;
  t.speed_square += speed_error * speed_error;
  if (!(size <= t.speed_max)) t.speed_max = size;
  const double flux_error = estimate.rotor_flux - plant[P::rotor_flux];
  t.flux_square += flux_error * flux_error;
  const double torque_error = estimate.torque - plant[P::torque];
  t.torque_square += torque_error * torque_error;
  if (plant[P::rotor_flux] >= 0.1 * basis_.rated_rotor_flux_Wb) {
    const double angle_error = wrapped_degrees(estimate.rotor_flux_angle - plant[P::rotor_flux_angle]);
    t.angle_count += 1;
    t.angle_square += angle_error * angle_error;
  }
  if (size <= basis_.settled_error * basis_.rated_speed_rpm) {
    if (!t.settled_at) t.settled_at = time_s;
  } else {
    t.settled_at.reset();
  }
}

std::vector<EstimatorFigures> EstimatorScore::figures() const {
  std::vector<EstimatorFigures> all;
  for (const Tally& t : tallies_) {
    EstimatorFigures f;
    f.lost_at_s = t.lost_at;
    f.settled_at_s = t.settled_at;
    if (t.count > 0) {
      f.speed_rmse_rpm = root_mean(t.speed_square, t.count);
      f.speed_bias_rpm = finite(t.speed_sum / t.count);
      f.speed_max_error_rpm = f.speed_rmse_rpm ? finite(t.speed_max) : Figure();
      f.flux_rmse_Wb = root_mean(t.flux_square, t.count);
      f.angle_rmse_deg = root_mean(t.angle_square, t.angle_count);
      f.torque_rmse_Nm = root_mean(t.torque_square, t.count);
    }
    all.push_back(f);
  }
  return all;
}

}  // namespace slipbench
