// The longer members of DriveLoop: set-up, sampling, control, divergence, saving.
#pragma once

#include <utility>

#include "sim/engine/drive_loop.hpp"

namespace slipbench {

template <class Real>
DriveLoop<Real>::DriveLoop(Cases cases)
    : shape_(cases[0]->shape),
      plant_(cases),
      sensors_(cases),
      speed_reference_(cases, [](const RunSetup& s) -> const Profile& { return s.speed_reference; }),
      torque_reference_(cases, [](const RunSetup& s) -> const Profile& { return s.torque_reference; }) {
  const ControlShape& control = shape_.control;
  for (std::size_t i = 0; i < control.estimators.size(); ++i) {
    if constexpr (width == 1) {
      if (cases[0]->own_estimators[i]) {
        estimators_.push_back(cases[0]->own_estimators[i]);
        continue;
      }
    }
    estimators_.push_back(load_estimator<Real>(cases, i));
  }
  if constexpr (width == 1) controller_ = cases[0]->own_controller;
  if (control.present && !controller_) controller_ = load_controller<Real>(cases);
  side_by_side<Real>(
      believed_leg_, cases, [](const RunSetup& s) -> const auto& { return s.believed_leg; });
  side_by_side<Real>(
      duty_, cases, [](const RunSetup& s) -> const auto& { return s.state.duty; });
  for (std::size_t i = 0; i < pending_.size(); ++i)
    side_by_side<Real>(
        pending_[i], cases, [i](const RunSetup& s) -> const auto& { return s.state.pending[i]; });
  estimates_.resize(estimators_.size());
}

template <class Real>
Vec2<Real> DriveLoop<Real>::believed_voltage(const Reading<Real>& before, const Reading<Real>& now,
                                             std::int64_t k) const {
  const Real half(0.5);
  if (plant_.gates_open()) return {};  // unknown to control electronics: called none
  if (shape_.plant.supply == Supply::mains) {
    const bool just_switched_on = k == 0 && shape_.control.from_standstill;
    return just_switched_on ? Vec2<Real>{} : half * (before.voltage + now.voltage);
  }
  const Real dc_link = half * (before.dc_link + now.dc_link);
  if (!shape_.control.compensated) return applied_voltage(duty_, dc_link);
  return averaged_voltage(believed_leg_, phases_of(half * (before.current + now.current)), duty_, dc_link);
}

template <class Real>
void DriveLoop<Real>::sense(std::int64_t k) {
  const Reading<Real> before = sensors_.reading();
  const Reading<Real>& now = sensors_.read(plant_, k);
  const Vec2<Real> u = believed_voltage(before, now, k);
  sample_.tick = k;
  sample_.u_alpha = u.x;
  sample_.u_beta = u.y;
  sample_.i_alpha = now.current.x;
  sample_.i_beta = now.current.y;
  sample_.dc_link = now.dc_link;
  sample_.speed = now.speed;
}

template <class Real>
void DriveLoop<Real>::refer(std::int64_t k) {
  const double t = static_cast<double>(k > 0 ? k : 0) * shape_.control_period_s;
  // Just after a jump, whatever the rounding of t against the knot.
  const auto now = [&](ProfilePack<Real>& p) { return p.line_at(t + 0.5 * shape_.plant.step_s).at(t); };
  speed_reference_now_ = now(speed_reference_);
  torque_reference_now_ = now(torque_reference_);
}

template <class Real>
void DriveLoop<Real>::control(std::int64_t k) {
  if (!controller_) return;
  refer(k);
  const std::int64_t speed_from = shape_.control.speed_from, flux_from = shape_.control.flux_from;
  Measurement<Real>& m = measurement_;
  m.tick = k;
  m.current = sensors_.reading().current;
  m.dc_link = sensors_.reading().dc_link;
  m.speed = speed_from < 0 ? sensors_.reading().speed : estimates_[static_cast<std::size_t>(speed_from)].speed;
  if (flux_from >= 0) {
    m.rotor_flux = estimates_[static_cast<std::size_t>(flux_from)].rotor_flux;
    m.rotor_flux_angle = estimates_[static_cast<std::size_t>(flux_from)].rotor_flux_angle;
  }
  m.speed_reference = speed_reference_now_;
  m.torque_reference = torque_reference_now_;
  obey(controller_->step(m));
}

template <class Real>
void DriveLoop<Real>::obey(const Command<Real>& command) {
  command_ = command;
  // The command leaves now and acts d periods later.
  duty_ = command_.duty;
  if (const auto delay = static_cast<std::size_t>(shape_.control.delay_periods); delay > 0) {
    std::swap(duty_, pending_[next_pending_]);
    next_pending_ = next_pending_ + 1 == delay ? 0 : next_pending_ + 1;
  }
  plant_.apply(duty_);
}

template <class Real>
PlantRowOf<Real> DriveLoop<Real>::row(std::int64_t n) {
  PlantRowOf<Real> row = plant_.row(n);
  if (controller_) {
    if (shape_.control.speed_control) row[P::speed_reference_rpm] = speed_reference_now_ / Real(rad_s_in_rpm);
    row[P::rotor_flux_reference] = command_.rotor_flux_reference;
  }
  return row;
}

template <class Real>
bool DriveLoop<Real>::find_lost(const MaskOf<Real>& watched, std::array<Lost, width>& lost) const {
  struct Suspect {
    Lost what;
    MaskOf<Real> gone;
  };
  const MaskOf<Real> none(false);
  const std::int64_t speed_from = controller_ ? shape_.control.speed_from : -1,
                     flux_from = controller_ ? shape_.control.flux_from : -1;
  const Phases<Real>& duty = command_.duty;
  const std::array<Suspect, 6> suspects{{
      {Lost::stator_flux, plant_.lost(Lost::stator_flux)},
      {Lost::rotor_flux, plant_.lost(Lost::rotor_flux)},
      {Lost::speed, plant_.lost(Lost::speed)},
      {Lost::speed_estimate, speed_from < 0 ? none : estimate_lost(speed_from)},
      {Lost::flux_estimate, flux_from < 0 ? none : estimate_lost(flux_from)},
      {Lost::command, !controller_ ? none : MaskOf<Real>(!is_finite(duty.a + duty.b + duty.c))},
  }};
  MaskOf<Real> gone = none;
  for (const Suspect& suspect : suspects) gone = gone | suspect.gone;
  if (!any(MaskOf<Real>(gone & watched))) return false;
  for (std::size_t lane = 0; lane < width; ++lane) {
    lost[lane] = Lost::nothing;
    for (std::size_t s = suspects.size(); s-- > 0;) {
      if (lane_of(watched, lane) && lane_of(suspects[s].gone, lane)) lost[lane] = suspects[s].what;
    }
  }
  return true;
}

template <class Real>
void DriveLoop<Real>::save(RunSetup& to, std::size_t lane) const {
  RunState<double>& state = to.state;
  for (std::size_t i = 0; i < state.drive.size(); ++i) state.drive[i] = lane_of(plant_.state()[i], lane);
  apart<Real>(duty_, lane, state.duty);
  const auto delay = static_cast<std::size_t>(shape_.control.delay_periods);
  for (std::size_t i = 0; i < delay; ++i) apart<Real>(pending_[(next_pending_ + i) % delay], lane, state.pending[i]);
  sensors_.save(state.sensors, lane);
  for (std::size_t i = 0; i < estimators_.size(); ++i) estimators_[i]->save(to.estimators[i].state, lane);
  if (controller_) controller_->save(to.controller.state, lane);
}

}  // namespace slipbench
