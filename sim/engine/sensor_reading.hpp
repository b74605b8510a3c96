// The longer members of Sensors: set-up, filters between ticks, the readings at one.
#pragma once

#include "sim/engine/sensors.hpp"

namespace slipbench {

namespace detail {
template <class Real, template <class> class Struct, class Get>
Struct<Real> packed(Cases cases, Get get) {
  Struct<Real> all;
  side_by_side<Real>(all, cases, get);
  return all;
}
}  // namespace detail

template <class Real>
Sensors<Real>::Sensors(Cases cases)
    : shape_(cases[0]->shape.sensors),
      mains_(cases[0]->shape.plant.supply == Supply::mains),
      tracks_(shape_.has_speed || shape_.current_filtered || (shape_.has_voltage && shape_.voltage_filtered) ||
              (shape_.has_dc_link && shape_.dc_link_filtered)),
      c_(detail::packed<Real, SensorNumbers>(
          cases, [](const RunSetup& s) -> const auto& { return s.sensors; })),
      noise_(cases),
      current_(channels(c_.current, {}, shape_.current_filtered, {"current_a", "current_b", "current_c"})),
      voltage_(channels(c_.voltage, {}, shape_.voltage_filtered, {"voltage_a", "voltage_b", "voltage_c"})),
      dc_link_(channel(c_.dc_link, {}, shape_.dc_link_filtered, "dc_link")),
      value_count_((shape_.two_currents ? 2u : 3u) + (shape_.has_voltage ? 3u : 0u) + (mains_ ? 0u : 1u) +
                   (shape_.has_speed ? 1u : 0u)) {
  const auto state = detail::packed<Real, SensorState>(
      cases, [](const RunSetup& s) -> const auto& { return s.state.sensors; });
  for (std::size_t i = 0; i < 3; ++i) {
    current_[i].state = state.current[i];
    voltage_[i].state = state.voltage[i];
  }
  dc_link_.state = state.dc_link;
  speed_state_ = state.speed;
  angle_before_ = state.angle_before;
  reading_ = state.reading;
}

template <class Real>
void Sensors<Real>::save(SensorState<double>& to, std::size_t lane) const {
  SensorState<Real> state;
  for (std::size_t i = 0; i < 3; ++i) {
    state.current[i] = current_[i].state;
    state.voltage[i] = voltage_[i].state;
  }
  state.dc_link = dc_link_.state;
  state.speed = speed_state_;
  state.angle_before = angle_before_;
  state.reading = reading_;
  apart<Real>(state, lane, to);
}

template <class Real>
void Sensors<Real>::begin(const Plant<Real>& plant, std::int64_t step) {
  static_assert(width_of<Real> == 1, "prepared alone, once");
  const auto settle = [](Three& three, const Phases<Real>& x) {
    three[0].state = begin_analog(x.a);
    three[1].state = begin_analog(x.b);
    three[2].state = begin_analog(x.c);
  };
  settle(current_, plant.phase_currents());
  if (shape_.has_voltage) settle(voltage_, phases_of(plant.voltage_at(step)));
  dc_link_.state = begin_analog(plant.dc_link());
  speed_state_ = begin_speed_sensor(c_.speed, plant.angle(), plant.speed(), step);
  angle_before_ = plant.angle();
}

template <class Real>
void Sensors<Real>::follow(const Plant<Real>& plant, std::int64_t step) {
  if (shape_.current_filtered) filter(current_, plant.phase_currents());
  if (shape_.has_voltage && shape_.voltage_filtered) filter(voltage_, phases_of(plant.voltage_at(step)));
  if (shape_.has_dc_link && shape_.dc_link_filtered) filter(dc_link_, plant.dc_link());
  if (shape_.has_speed) {
    if (speed_fault_ == Fault::no_signal && shape_.speed.kind == SpeedSensorKind::encoder) return;
    const Real angle = plant.angle() - angle_unseen_;
    slipbench::advance(speed_state_, angle_before_, angle, plant.speed(), step - 1, c_.speed, shape_.speed);
    angle_before_ = angle;
  }
}

template <class Real>
void Sensors<Real>::set_speed_fault(Fault fault, const Plant<Real>& plant) {
  edges_held_ = encoder_edges();
  if (speed_fault_ == Fault::no_signal && fault != Fault::no_signal && shape_.speed.kind == SpeedSensorKind::encoder) {
    const Real per_rad = c_.speed.encoder.edges_per_rad;
    angle_unseen_ = angle_unseen_ + floor((plant.angle() - angle_unseen_ - angle_before_) * per_rad) / per_rad;
    angle_before_ = plant.angle() - angle_unseen_;
  }
  speed_fault_ = fault;
}

template <class Real>
Real Sensors<Real>::convert_one(Channel& channel, const Real& input, std::int64_t tick) {
  const Real zero(0.0);
  if (channel.fault == Fault::stuck) return channel.last;
  if (!channel.filtered) channel.state.filtered = channel.fault == Fault::no_signal ? zero : input;
  Real normal = zero;
  if (tick >= 0 && channel.noisy) {
    normal = channel.noise.at(noise_, tick);
    if constexpr (width_of < Real >> 1) normal = select(zero < channel.sensor.noise_rms, normal, zero);
  }
  const AnalogReading<Real> reading = convert(channel.state, normal, channel.sensor);
  if (tick >= 0) clipped_ = clipped_ + reading.clipped;
  channel.last = reading.value;
  return reading.value;
}

template <class Real>
const Reading<Real>& Sensors<Real>::read(const Plant<Real>& plant, std::int64_t tick) {
  std::size_t at = 0;
  const Phases<Real> truth = plant.phase_currents();
  Phases<Real> i;
  i.a = values_[at++] = convert_one(current_[0], truth.a, tick);
  i.b = values_[at++] = convert_one(current_[1], truth.b, tick);
  if (shape_.two_currents) {
    reading_.current = clarke_two(i.a, i.b);
  } else {
    i.c = values_[at++] = convert_one(current_[2], truth.c, tick);
    reading_.current = clarke(i);
  }
  if (shape_.has_voltage) {
    const Phases<Real> true_u = phases_of(plant.voltage_at(tick * shape_.speed.steps_per_tick));
    Phases<Real> u;
    u.a = values_[at++] = convert_one(voltage_[0], true_u.a, tick);
    u.b = values_[at++] = convert_one(voltage_[1], true_u.b, tick);
    u.c = values_[at++] = convert_one(voltage_[2], true_u.c, tick);
    reading_.voltage = clarke(u);
  }
  reading_.dc_link = shape_.has_dc_link ? convert_one(dc_link_, plant.dc_link(), tick) : c_.believed_dc_link;
  if (!mains_) values_[at++] = reading_.dc_link;
  Real noise(0.0);
  if (shape_.speed.kind == SpeedSensorKind::tachogenerator && tick >= 0) noise = speed_noise_.at(noise_, tick);
  const Real speed = read_speed(speed_state_, tick, noise, c_.speed, shape_.speed);
  if (speed_fault_ == Fault::no_signal && shape_.speed.kind != SpeedSensorKind::encoder)
    reading_.speed = Real(0.0);
  else if (speed_fault_ != Fault::stuck)
    reading_.speed = speed;
  if (shape_.has_speed) values_[at++] = reading_.speed / Real(rad_s_in_rpm);
  return reading_;
}

}  // namespace slipbench
