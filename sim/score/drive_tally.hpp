// The sums behind DriveFigures, of one run (double) or of a pack of runs side by side: each lane gets the bits of its run alone.
// What the figures mean stands in drive_score.hpp.
#pragma once

#include <array>
#include <limits>

#include "sim/engine/plant_row.hpp"
#include "sim/engine/profile_pack.hpp"
#include "sim/score/estimator_tally.hpp"

namespace slipbench {

template <class Real>
class DriveTally {
 public:
  static constexpr std::size_t width = width_of<Real>;

  // `used` lanes of the bases count; the others stand for nobody.
  explicit DriveTally(Bases bases, std::size_t used = width)
      : main_inductance_(of_circuit(bases, &Circuit<double>::magnetizing_inductance)),
        rotor_leakage_(of_circuit(bases, &Circuit<double>::rotor_leakage)),
        main_factor_(bases, [](const ScoreBasis& b) -> const Profile& { return b.magnetizing_factor; }),
        leakage_factor_(bases, [](const ScoreBasis& b) -> const Profile& { return b.rotor_leakage_factor; }),
        has_controller_(bases[0]->has_controller) {
    for (std::size_t lane = 0; lane < used; ++lane) {
      lanes_[lane].steps_s = bases[lane]->load_steps_s;
      lanes_[lane].from_s = bases[lane]->window.from_s;
    }
    find_soonest();
  }

  // `plant(P)` gives a column of the row at this tick. Ticks outside every lane's window need not be told.
  template <class Columns>
  void judge(const ScoreLimits<Real>& limits, const MaskOf<Real>& in_window, const Columns& plant,
             const MaskOf<Real>& clipped, double time_s) {
    const Real one(1.0), speed = plant(P::speed_rpm), reference = plant(P::speed_reference_rpm);
    const auto add = [&](Real& sum, const Real& more) { sum = select(in_window, sum + more, sum); };
    add(count_, one);
    const Real tracking = speed - reference;
    add(tracking_square_, tracking * tracking);
    add(clipped_, select(clipped, one, Real(0.0)));
    const Real i_alpha = plant(P::i_alpha), i_beta = plant(P::i_beta);
    const Real current_square = i_alpha * i_alpha + i_beta * i_beta;
    peak_square_ = select(MaskOf<Real>(in_window & !(current_square <= peak_square_)), current_square, peak_square_);
    const Real torque = plant(P::torque), off_mean = torque - torque_mean_;
    add(torque_mean_, off_mean / count_);
    add(torque_square_, off_mean * (torque - torque_mean_));
    add(loss_sum_, copper_loss(plant, time_s));
    if (soonest_step_s_ <= time_s + limits.slack_s) pass_steps(limits, in_window, reference, speed, time_s);
    if (watching_) watch(limits, in_window, reference, speed, Real(time_s));
  }

  [[nodiscard]] DriveFigures figures(std::size_t lane) const {
    const auto of = [&](const Real& x) { return lane_of(x, lane); };
    DriveFigures f;
    const double count = of(count_);
    if (count == 0) return f;
    f.speed_tracking_rmse_rpm = detail::root_mean(of(tracking_square_), count);
    f.peak_current_A = detail::finite(std::sqrt(of(peak_square_)));
    f.torque_ripple_Nm = detail::root_mean(of(torque_square_), count);
    f.copper_loss_W = detail::finite(of(loss_sum_) / count);
    if (has_controller_) f.voltage_clipped_fraction = of(clipped_) / count;
    if (!lanes_[lane].watched) return f;
    Past all = lanes_[lane].past;
    all.add(of(start_s_), of(dip_rpm_), of(recovered_at_s_));
    f.load_dip_rpm = detail::finite(all.dip_rpm);
    if (all.recovered) f.recovery_s = detail::finite(all.recovery_s);
    return f;
  }

 private:
  static constexpr double none = std::numeric_limits<double>::quiet_NaN();

  struct Past {  // what watched load steps came to
    double dip_rpm = 0.0, recovery_s = 0.0;
    bool recovered = true;
    void add(double start_s, double dip, double recovered_at_s) {
      if (!(dip <= dip_rpm)) dip_rpm = dip;
      recovered &= !std::isnan(recovered_at_s);
      if (recovered_at_s - start_s > recovery_s) recovery_s = recovered_at_s - start_s;
    }
  };
  struct Lane {
    std::vector<double> steps_s;
    std::size_t next = 0;
    double from_s = 0.0;
    bool watched = false;  // a load step is, or was, watched
    Past past;             // those before the one that is watched
  };

  static Real of_circuit(Bases bases, double Circuit<double>::*value) {
    return each_basis<Real>(bases, [&](const ScoreBasis& b) { return b.circuit.*value; });
  }

  template <class Columns>
  Real copper_loss(const Columns& plant, double time_s) {
    const Real L_m = main_inductance_ * main_factor_.line_at(time_s).at(time_s);
    const Real L_r = L_m + rotor_leakage_ * leakage_factor_.line_at(time_s).at(time_s);
    const Real i_d = plant(P::i_d), i_q = plant(P::i_q);
    const Real rotor_d = (plant(P::rotor_flux) - L_m * i_d) / L_r, rotor_q = -L_m * i_q / L_r;
    return Real(1.5) * (plant(P::stator_resistance) * (i_d * i_d + i_q * i_q) +
                        plant(P::rotor_resistance) * (rotor_d * rotor_d + rotor_q * rotor_q));
  }

  void find_soonest() {
    soonest_step_s_ = std::numeric_limits<double>::infinity();
    for (const Lane& lane : lanes_) {
      if (lane.next < lane.steps_s.size()) soonest_step_s_ = min(soonest_step_s_, lane.steps_s[lane.next]);
    }
  }

  // Load steps that have come: a new one is watched from now on, in place of the one before.
  void pass_steps(const ScoreLimits<Real>& limits, const MaskOf<Real>& in_window, const Real& reference,
                  const Real& speed, double time_s) {
    for (std::size_t i = 0; i < width; ++i) {
      Lane& lane = lanes_[i];
      if (!lane_of(in_window, i)) continue;
      bool stepped = false;
      for (; lane.next < lane.steps_s.size() && lane.steps_s[lane.next] <= time_s + limits.slack_s; ++lane.next)
        stepped |= lane.steps_s[lane.next] >= lane.from_s - limits.slack_s;
      if (!stepped) continue;
      if (lane.watched) lane.past.add(lane_of(start_s_, i), lane_of(dip_rpm_, i), lane_of(recovered_at_s_, i));
      lane.watched = watching_ = true;
      set_lane(start_s_, i, lane.steps_s[lane.next - 1]);
      set_lane(reference_rpm_, i, lane_of(reference, i));
      set_lane(start_rpm_, i, lane_of(speed, i));
      set_lane(dip_rpm_, i, 0.0);
      set_lane(recovered_at_s_, i, none);
      set_lane(open_, i, 1.0);
    }
    find_soonest();
  }

  void watch(const ScoreLimits<Real>& limits, const MaskOf<Real>& in_window, const Real& reference, const Real& speed,
             const Real& time_s) {
    const MaskOf<Real> referred = detail::exists(reference_rpm_);
    open_ = select(MaskOf<Real>(in_window & referred & (reference != reference_rpm_)), Real(0.0), open_);
    const MaskOf<Real> on = in_window & (Real(0.0) < open_);
    const Real off = fabs(speed - select(referred, reference, start_rpm_));
    dip_rpm_ = select(MaskOf<Real>(on & !(off <= dip_rpm_)), off, dip_rpm_);
    const Real since = select(detail::exists(recovered_at_s_), recovered_at_s_, time_s);
    const MaskOf<Real> back = referred & (off <= limits.settled_rpm);
    recovered_at_s_ = select(on, select(back, since, Real(none)), recovered_at_s_);
  }

  Real count_{0.0}, tracking_square_{0.0}, clipped_{0.0}, loss_sum_{0.0}, peak_square_{0.0};
  Real torque_mean_{0.0}, torque_square_{0.0};  // running mean and sum of squares about it (Welford)
  Real main_inductance_, rotor_leakage_;        // of the true circuit at t = 0, H
  ProfilePack<Real> main_factor_, leakage_factor_;
  bool has_controller_;

  std::array<Lane, width> lanes_;
  double soonest_step_s_ = 0.0;
  // The load step that is watched.
  bool watching_ = false;  // in some lane one is, or was
  Real start_s_{0.0}, reference_rpm_{0.0}, start_rpm_{0.0}, dip_rpm_{0.0}, recovered_at_s_{none}, open_{0.0};
};

}  // namespace slipbench
