// The sums behind EstimatorFigures, of one estimator of one run (double) or of a pack of runs side by side: each lane gets the
// bits of its run alone. What the figures mean stands in estimator_score.hpp.
//
// Times that do not exist (yet) are NaN. A NaN compares false with everything, so that "within" is asked for, never "beyond".
#pragma once

#include <cmath>
#include <limits>

#include "sim/score/figures.hpp"
#include "sim/score/score_limits.hpp"

namespace slipbench {

namespace detail {
inline Figure finite(double x) { return std::isfinite(x) ? Figure(x) : Figure(); }
inline Figure existing(double x) { return std::isnan(x) ? Figure() : Figure(x); }
inline Figure root_mean(double sum_of_squares, double count) {
  return count > 0 ? finite(std::sqrt(sum_of_squares / count)) : Figure();
}
template <class Real>
MaskOf<Real> exists(const Real& x) {
  return x == x;
}
}  // namespace detail

// Speed electrical or not as Estimate has it (mechanical rad/s), Wb, rad, N m.
template <class Real>
struct JudgedEstimate {
  Real speed, rotor_flux, rotor_flux_angle, torque;
};
template <class Real>
struct JudgedBy {
  Real speed_rpm, rotor_flux, rotor_flux_angle, torque;
};

template <class Real>
class EstimatorTally {
 public:
  // At every tick of the run: an estimate may be lost before the window begins.
  void judge(const ScoreLimits<Real>& limits, const MaskOf<Real>& in_window, const JudgedBy<Real>& truth,
             const JudgedEstimate<Real>& estimate, double time_s) {
    const Real speed_error = estimate.speed * Real(30.0 / pi) - truth.speed_rpm, size = fabs(speed_error);
    watch_loss(limits, in_window, speed_error, size, Real(time_s));
    if (!any(in_window)) return;
    const Real one(1.0);
    const auto add = [&](Real& sum, const Real& more) { sum = select(in_window, sum + more, sum); };
    add(count_, one);
    add(speed_sum_, speed_error);
    add(speed_square_, speed_error * speed_error);
    speed_max_ = select(MaskOf<Real>(in_window & !(size <= speed_max_)), size, speed_max_);
    const Real flux_error = estimate.rotor_flux - truth.rotor_flux;
    add(flux_square_, flux_error * flux_error);
    const Real torque_error = estimate.torque - truth.torque;
    add(torque_square_, torque_error * torque_error);
    const MaskOf<Real> magnetised = in_window & (limits.least_flux_Wb <= truth.rotor_flux);
    const Real angle_error = wrapped_degrees(estimate.rotor_flux_angle - truth.rotor_flux_angle);
    angle_count_ = select(magnetised, angle_count_ + one, angle_count_);
    angle_square_ = select(magnetised, angle_square_ + angle_error * angle_error, angle_square_);
    const Real since = select(detail::exists(settled_at_), settled_at_, Real(time_s));
    settled_at_ = select(in_window, select(size <= limits.settled_rpm, since, Real(none)), settled_at_);
  }

  [[nodiscard]] EstimatorFigures figures(std::size_t lane) const {
    const auto of = [&](const Real& x) { return lane_of(x, lane); };
    EstimatorFigures f;
    f.lost_at_s = detail::existing(of(lost_at_));
    f.settled_at_s = detail::existing(of(settled_at_));
    const double count = of(count_);
    if (!(count > 0)) return f;
    f.speed_rmse_rpm = detail::root_mean(of(speed_square_), count);
    f.speed_bias_rpm = detail::finite(of(speed_sum_) / count);
    f.speed_max_error_rpm = f.speed_rmse_rpm ? detail::finite(of(speed_max_)) : Figure();
    f.flux_rmse_Wb = detail::root_mean(of(flux_square_), count);
    f.angle_rmse_deg = detail::root_mean(of(angle_square_), of(angle_count_));
    f.torque_rmse_Nm = detail::root_mean(of(torque_square_), count);
    return f;
  }

 private:
  static constexpr double pi = 3.14159265358979323846, none = std::numeric_limits<double>::quiet_NaN();

  // To [-180, 180): a figure, not a state, so the turn taken off need not be exact to the last bit.
  static Real wrapped_degrees(const Real& angle_rad) {
    const Real turns = angle_rad * Real(0.5 / pi);
    return Real(360.0) * (turns - floor(turns + Real(0.5)));
  }

  void watch_loss(const ScoreLimits<Real>& limits, const MaskOf<Real>& in_window, const Real& speed_error,
                  const Real& size, const Real& time_s) {
    const MaskOf<Real> broken = !is_finite(speed_error), off = in_window & !(size <= limits.lost_rpm);
    const MaskOf<Real> away = broken | off;
    if (!any(away) && !away_) return;
    const Real since = select(detail::exists(off_since_), off_since_, time_s);
    const MaskOf<Real> lost = broken | (off & (limits.lost_for_s <= time_s - since));
    lost_at_ = select(MaskOf<Real>(lost & !detail::exists(lost_at_)), since, lost_at_);
    off_since_ = select(away, since, Real(none));
    away_ = any(away);
  }

  Real count_{0.0}, speed_sum_{0.0}, speed_square_{0.0}, speed_max_{0.0}, flux_square_{0.0}, torque_square_{0.0};
  Real angle_count_{0.0}, angle_square_{0.0};
  Real lost_at_{none}, off_since_{none}, settled_at_{none};
  bool away_ = false;  // some lane was beyond the limit at the last tick
};

}  // namespace slipbench
