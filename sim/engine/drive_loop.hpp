// One closed loop, for one case (double) or for a pack of cases side by side, each lane with the bits it would have alone:
// plant, sensors, estimators and controller, and what passes between them at a control tick.
//
// The voltage computed at k stands over [k + d, k + d + 1). Estimators at k get the current at k and the mean voltage
// believed applied over [k-1, k): duties times the measured DC link, less the inverter error that is compensated; on mains
// the mean of the measured voltages at k-1 and k (trapezoid: short by (w T)^2 / 12, 8e-5 at 50 Hz and 100 us).
//
// After construction nothing allocates, locks or throws. At tick k in this order: disturb, sense, estimate, control.
#pragma once

#include "sim/engine/built_in_ports.hpp"
#include "sim/engine/sensors.hpp"

namespace slipbench {

template <class Real>
class DriveLoop {
 public:
  static constexpr std::size_t width = width_of<Real>;

  // As many cases as there are lanes, all of one shape; they are copied.
  explicit DriveLoop(Cases cases);

  void disturb(std::int64_t k) { plant_.disturb(k); }
  void sense(std::int64_t k);
  void estimate(std::size_t which) { estimates_[which] = estimators_[which]->step(sample_); }
  void estimate() {
    for (std::size_t i = 0; i < estimators_.size(); ++i) estimate(i);
  }
  void control(std::int64_t k);
  // The two halves of it for a controller that is outside: references at tick k; a command that leaves now.
  void refer(std::int64_t k);
  void obey(const Command<Real>& command);
  void set_gates(bool enabled) { plant_.set_gates(enabled); }
  // An estimate that comes from outside: a place for it behind the estimators' own, and its value at this tick.
  void add_estimate() { estimates_.emplace_back(); }
  void set_last_estimate(const Estimate<Real>& estimate) { estimates_.back() = estimate; }
  void plant_step(std::int64_t n) {
    plant_.step(n);
    sensors_.track(plant_, n + 1);
  }

  // The plant and the references at step n.
  PlantRowOf<Real> row(std::int64_t n);
  // The first thing gone wrong in each lane that is watched (mask); false: nothing in any.
  bool find_lost(const MaskOf<Real>& watched, std::array<Lost, width>& lost) const;
  // Writes one lane as it stands into its setup, which then goes on from here. Between two ticks; built-in methods only.
  void save(RunSetup& to, std::size_t lane) const;

  [[nodiscard]] const RunShape& shape() const { return shape_; }
  [[nodiscard]] const std::vector<Estimate<Real>>& estimates() const { return estimates_; }
  [[nodiscard]] const Real& clipped() const { return command_.clipped; }  // the controller's voltage limit acted
  [[nodiscard]] const Sample<Real>& sample() const { return sample_; }
  [[nodiscard]] const Measurement<Real>* measurement() const { return controller_ ? &measurement_ : nullptr; }
  [[nodiscard]] const Command<Real>* command() const { return controller_ ? &command_ : nullptr; }
  [[nodiscard]] const Plant<Real>& plant() const { return plant_; }
  [[nodiscard]] const Real& speed_reference() const { return speed_reference_now_; }
  [[nodiscard]] const Real& torque_reference() const { return torque_reference_now_; }
  [[nodiscard]] Sensors<Real>& sensors() { return sensors_; }
  [[nodiscard]] std::size_t estimator_count() const { return estimators_.size(); }
  void take_no_estimates() { shape_.control.speed_from = shape_.control.flux_from = -1; }
  void take_speed_from(std::int64_t estimator) { shape_.control.speed_from = estimator; }  // -1: the sensor

 private:
  [[nodiscard]] Vec2<Real> believed_voltage(const Reading<Real>& before, const Reading<Real>& now,
                                            std::int64_t k) const;
  [[nodiscard]] MaskOf<Real> estimate_lost(std::int64_t which) const {
    const Estimate<Real>& e = estimates_[static_cast<std::size_t>(which)];
    return !is_finite(e.speed + e.rotor_flux + e.rotor_flux_angle);
  }

  RunShape shape_;
  Plant<Real> plant_;
  Sensors<Real> sensors_;
  std::vector<std::shared_ptr<EstimatorPortOf<Real>>> estimators_;
  std::shared_ptr<ControllerPortOf<Real>> controller_;
  LegError<Real> believed_leg_;
  ProfilePack<Real> speed_reference_, torque_reference_;
  Real speed_reference_now_{}, torque_reference_now_{};

  Sample<Real> sample_;
  Measurement<Real> measurement_;
  std::vector<Estimate<Real>> estimates_;
  Command<Real> command_;
  std::array<Phases<Real>, 2> pending_;  // commands not yet acting, as a ring
  std::size_t next_pending_ = 0;
  Phases<Real> duty_;  // acting over [k-1, k) when tick k begins
};

}  // namespace slipbench

#include "sim/engine/drive_tick.hpp"
