// The longer members of Plant: set-up, process noise, step, row.
#pragma once

#include "sim/engine/plant.hpp"

namespace slipbench {

template <class Real>
Plant<Real>::Plant(Cases cases)
    : shape_(cases[0]->shape.plant),
      imposed_(cases, [](const RunSetup& s) -> const Profile& { return s.imposed_speed; }),
      noise_(cases) {
  side_by_side<Real>(
      c_, cases, [](const RunSetup& s) -> const auto& { return s.plant; });
  side_by_side<Real>(
      duty_, cases, [](const RunSetup& s) -> const auto& { return s.state.duty; });
  for (std::size_t i = 0; i < x_.size(); ++i)
    x_[i] = number_of<Real>(cases, [i](const RunSetup& s) { return s.state.drive[i]; });
  drive_ = c_.drive;
  drive_.supply = shape_.supply;
  drive_.speed_imposed = shape_.speed_imposed;
  drive_.inverter_ideal = shape_.inverter_ideal;
  drive_.opposed = shape_.opposed;
  circuit_now_ = c_.circuit;
  dc_link_now_ = c_.dc_link;
  for (std::size_t i = 0; i < shape_.profiles; ++i)
    loads_.emplace_back(cases, [i](const RunSetup& s) -> const Profile& { return s.loads[i]; });
  for (std::size_t i = 0; i < shape_.drifts.size(); ++i) {
    const auto factor = [i](const RunSetup& s) -> const Profile& { return s.drifts[i]; };
    drifts_.push_back({shape_.drifts[i], ProfilePack<Real>(cases, factor), Real(1.0)});
  }
  lines_ = shape_.profiles > 0 || shape_.speed_imposed;
  const Real zero(0.0);
  load_walks_ = any(zero < c_.walk_per_tick);
  current_moves_ = any(zero < c_.current_noise);
  flux_moves_ = any(zero < c_.flux_noise);
  apply(duty_);
  set_drift(0.0, 0.5 * shape_.step_s);
}

template <class Real>
void Plant<Real>::disturb(std::int64_t tick) {
  if (tick <= 0) return;
  const Real zero(0.0);
  if (load_walks_) {
    const Real walked = input_.noise_torque + c_.walk_per_tick * load_noise_.at(noise_, tick);
    input_.noise_torque = select(zero < c_.walk_per_tick, walked, input_.noise_torque);
  }
  if (!current_moves_ && !flux_moves_) return;
  const auto pair = [&](auto& streams) { return Vec2<Real>{streams[0].at(noise_, tick), streams[1].at(noise_, tick)}; };
  const MaskOf<Real> current_moves = zero < c_.current_noise, flux_moves = zero < c_.flux_noise;
  MachineFlux<Real> psi = flux_of(x_);
  Vec2<Real> i_s = stator_current(drive_.machine, psi);
  if (current_moves_) i_s = select(current_moves, i_s + c_.current_noise * pair(current_noise_), i_s);
  if (flux_moves_) psi.rotor = select(flux_moves, psi.rotor + c_.flux_noise * pair(flux_noise_), psi.rotor);
  // From current and rotor flux back to the states: rounded, so lanes without either noise keep theirs.
  const Vec2<Real> stator = (Real(1.0) / drive_.machine.per_Ls) * (i_s + drive_.machine.per_Lm * psi.rotor);
  psi.stator = select(MaskOf<Real>(current_moves | flux_moves), stator, psi.stator);
  x_ = {psi.stator.x, psi.stator.y, psi.rotor.x, psi.rotor.y, x_[4], x_[5]};
}

template <class Real>
void Plant<Real>::set_drift(double t, double on_line_at) {
  if (on_line_at >= still_from_ && on_line_at < still_until_) return;
  still_from_ = -std::numeric_limits<double>::infinity(), still_until_ = -still_from_;
  bool moved = false;
  for (auto& drift : drifts_) {
    const Real factor = drift.factor.line_at(on_line_at).at(t);
    const auto [from, until] = drift.factor.level();
    still_from_ = max(still_from_, from), still_until_ = min(still_until_, until);
    moved = moved || any(factor != drift.now);
    drift.now = factor;
  }
  if (!moved) return;
  circuit_now_ = c_.circuit;
  Real inertia = c_.inertia, dc_link = c_.dc_link;
  for (const auto& drift : drifts_) {
    const auto scale = [&](Real& x) { x = x * drift.now; };
    switch (drift.what) {
      case Drifting::stator_resistance:
        scale(circuit_now_.stator_resistance);
        break;
      case Drifting::rotor_resistance:
        scale(circuit_now_.rotor_resistance);
        break;
      case Drifting::magnetizing_inductance:
        scale(circuit_now_.magnetizing_inductance);
        break;
      case Drifting::stator_leakage:
        scale(circuit_now_.stator_leakage);
        break;
      case Drifting::rotor_leakage:
        scale(circuit_now_.rotor_leakage);
        break;
      case Drifting::inertia:
        scale(inertia);
        break;
      case Drifting::dc_link:
        scale(dc_link);
        break;
      case Drifting::nothing:
        break;
    }
  }
  drive_.machine = make_machine(circuit_now_);
  drive_.shaft.per_inertia = Real(1.0) / inertia;
  if (any(dc_link != dc_link_now_)) {
    dc_link_now_ = dc_link;
    apply(duty_);
  }
}

template <class Real>
void Plant<Real>::set_lines(std::int64_t n) {
  const double middle = (static_cast<double>(n) + 0.5) * shape_.step_s;
  const auto line = [&](ProfilePack<Real>& p) {
    return n < 0 ? Line<Real>{p.line_at(0.0).at(0.0), Real(0.0), Real(0.0)} : p.line_at(middle);
  };
  if (!loads_.empty()) {
    Line<Real> sum = line(loads_.front());
    for (std::size_t i = 1; i < loads_.size(); ++i) {
      const Line<Real> more = line(loads_[i]);
      sum.value = sum.value + (more.value + more.slope * (sum.start - more.start));
      sum.slope = sum.slope + more.slope;
    }
    input_.load_profile = sum;
  }
  if (shape_.speed_imposed) input_.imposed_speed = line(imposed_);
}

template <class Real>
void Plant<Real>::step(std::int64_t n) {
  const double h = shape_.step_s, t = static_cast<double>(n) * h, middle = max(t + 0.5 * h, 0.0);
  const bool drifts = !drifts_.empty();
  if (drifts) set_drift(middle, middle);
  if (lines_) set_lines(n);
  if (!gates_open_) {
    advance(drive_, input_, source_, shape_.method, x_, t, h);
  } else if constexpr (width_of<Real> == 1) {
    open_stator();  // process noise and drift may have moved the fluxes
    advance_open(drive_, input_, shape_.method, x_, t, h);
  }
  // What sensors and rows see at the step's end is the value just after a jump there.
  const double end = static_cast<double>(n + 1 > 0 ? n + 1 : 0) * h;
  if (drifts) set_drift(end, end + 0.5 * h);
  if (shape_.speed_imposed) x_[4] = imposed_at(n + 1);
}

template <class Real>
PlantRowOf<Real> Plant<Real>::row(std::int64_t n) {
  const double t = static_cast<double>(n) * shape_.step_s;
  if (lines_) set_lines(n);
  const Real zero(0.0), one(1.0), nan(std::numeric_limits<double>::quiet_NaN());
  const MachineFlux<Real> psi = flux_of(x_);
  const Machine<Real>& m = drive_.machine;
  const Vec2<Real> i_s = stator_current(m, psi), i_r = rotor_current(m, psi), u = voltage_at(n);
  const Real flux = magnitude(psi.rotor);
  // Along and across the rotor flux; at no flux at all the frame's angle is 0.
  const MaskOf<Real> some = flux > zero;
  const Vec2<Real> along = select(some, (one / select(some, flux, one)) * psi.rotor, Vec2<Real>{one, zero});
  const Vec2<Real> i_dq = seen_from(along, i_s);
  const Real slip = select(some, -m.R_r * cross(psi.rotor, i_r) / select(some, flux * flux, one), zero);
  const Real speed = x_[4];
  const Phases<Real> i = phases_of(i_s);
  PlantRowOf<Real> row;
  row[P::time] = Real(t);
  row[P::speed_rpm] = speed / Real(rad_s_in_rpm);
  row[P::speed_reference_rpm] = nan;
  row[P::torque] = torque(m, psi, i_s);
  row[P::load_torque] = total_load(drive_, input_, speed, t);
  row[P::stator_frequency] = (m.pole_pairs * speed + slip) * Real(0.15915494309189533577);
  row[P::u_alpha] = u.x;
  row[P::u_beta] = u.y;
  row[P::i_alpha] = i_s.x;
  row[P::i_beta] = i_s.y;
  row[P::i_d] = i_dq.x;
  row[P::i_q] = i_dq.y;
  row[P::i_a] = i.a;
  row[P::i_b] = i.b;
  row[P::i_c] = i.c;
  row[P::rotor_flux] = flux;
  row[P::rotor_flux_angle] = atan2(along.y, along.x);
  row[P::rotor_flux_reference] = nan;
  row[P::dc_link] = shape_.supply == Supply::mains ? nan : dc_link_now_;
  row[P::stator_resistance] = m.R_s;
  row[P::rotor_resistance] = m.R_r;
  return row;
}

}  // namespace slipbench
