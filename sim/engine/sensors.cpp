#include "sim/engine/sensors.hpp"

#include <cmath>

namespace slipbench {

namespace {

constexpr double rad_s_per_rpm = 3.14159265358979323846 / 30.0;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();

SpeedSensorKind speed_kind(const std::string& word) {
  if (word == "ideal") return SpeedSensorKind::ideal;
  if (word == "tachogenerator") return SpeedSensorKind::tachogenerator;
  if (word == "encoder") return SpeedSensorKind::encoder;
  return SpeedSensorKind::none;
}

AnalogChannel channel_of(const AnalogSensorSettings& s, std::size_t phase) {
  return {s.noise, s.bandwidth_Hz, s.gain_error[phase], s.offset[phase], s.bits, s.range};
}

}  // namespace

Sensors::Three Sensors::channels(const AnalogSensorSettings& s, double step_s,
                                 const std::array<std::string_view, 3>& names) {
  Three three;
  for (std::size_t phase = 0; phase < 3; ++phase) {
    three.push_back({prepare_analog_sensor(channel_of(s, phase), step_s),
                     {},
                     NoiseStream(NoiseChannel(names[phase])),
                     s.bandwidth_Hz > 0.0});
  }
  return three;
}

Sensors::Sensors(const Scenario& s, std::uint32_t noise_run)
    : mains_(s.on_mains()),
      two_currents_(s.sensors.current_phases == 2),
      has_voltage_(s.sensors.voltage.present && mains_),
      has_dc_link_(s.sensors.dc_link.present && !mains_),
      has_speed_(s.sensors.speed.kind != "none"),
      steps_per_tick_(std::llround(s.run.control_period_s / s.run.plant_step_s)),
      believed_dc_link_(mains_ ? nan : s.supply.dc_link_V * s.belief.dc_link),
      current_noise_(total_noise_rms(channel_of(s.sensors.current, 0))),
      current_(channels(s.sensors.current, s.run.plant_step_s, {"current_a", "current_b", "current_c"})),
      voltage_(channels(s.sensors.voltage, s.run.plant_step_s, {"voltage_a", "voltage_b", "voltage_c"})),
      noise_(s.seed, noise_run),
      speed_noise_(NoiseChannel("speed")) {
  dc_link_.push_back({prepare_analog_sensor(channel_of(s.sensors.dc_link, 0), s.run.plant_step_s),
                      {},
                      NoiseStream(NoiseChannel("dc_link")),
                      s.sensors.dc_link.bandwidth_Hz > 0.0});
  const SpeedSensorSettings& v = s.sensors.speed;
  const SpeedSensorData data{
      speed_kind(v.kind), v.noise_rpm, v.bandwidth_Hz, {v.lines_per_rev, v.clock_Hz, v.timeout_s}, v.window_s};
  timing_ = speed_sensor_timing(data, steps_per_tick_, s.run.control_period_s);
  speed_ = prepare_speed_sensor(data, s.run.plant_step_s);
  values_.assign(columns().size(), nan);
  tracks_ = has_speed_ || current_.front().filtered || (has_voltage_ && voltage_.front().filtered) ||
            (has_dc_link_ && dc_link_.front().filtered);
}

std::vector<Column> Sensors::columns() const {
  std::vector<Column> all = {{"measured.i_a_A", "A", "measured phase current"},
                             {"measured.i_b_A", "A", "measured phase current"}};
  if (!two_currents_) all.push_back({"measured.i_c_A", "A", "measured phase current"});
  if (has_voltage_) {
    for (const char* name : {"measured.u_a_V", "measured.u_b_V", "measured.u_c_V"}) {
      all.push_back({name, "V", "measured phase voltage"});
    }
  }
  if (!mains_)
    all.push_back({"measured.dc_link_V", "V", "measured DC link voltage, the believed one without that sensor"});
  if (has_speed_) all.push_back({"measured.speed_rpm", "rpm", "measured speed"});
  return all;
}

void Sensors::settle(Three& channels, const Phases<double>& x) {
  const std::array<double, 3> inputs{x.a, x.b, x.c};
  for (std::size_t i = 0; i < channels.size(); ++i) channels[i].state = begin_analog(inputs[i]);
}

void Sensors::filter(Three& channels, const Phases<double>& x) {
  if (!channels.front().filtered) return;
  const std::array<double, 3> inputs{x.a, x.b, x.c};
  for (std::size_t i = 0; i < channels.size(); ++i) {
    const double input = channels[i].fault == Fault::no_signal ? 0.0 : inputs[i];
    filter_step(channels[i].state, input, channels[i].sensor);
  }
}

double Sensors::convert_one(Channel& channel, double input, std::int64_t tick) {
  if (channel.fault == Fault::stuck) return channel.last;
  if (!channel.filtered) channel.state.filtered = channel.fault == Fault::no_signal ? 0.0 : input;
  const double normal = tick >= 0 && channel.sensor.noise_rms > 0.0 ? channel.noise.at(noise_, tick) : 0.0;
  const AnalogReading<double> reading = convert(channel.state, normal, channel.sensor);
  if (tick >= 0 && reading.clipped != 0.0) ++clipped_;
  channel.last = reading.value;
  return reading.value;
}

Phases<double> Sensors::convert_three(Three& channels, const Phases<double>& x, std::int64_t tick) {
  return {convert_one(channels[0], x.a, tick), convert_one(channels[1], x.b, tick),
          convert_one(channels[2], x.c, tick)};
}

void Sensors::begin(const Plant& plant, std::int64_t step) {
  settle(current_, plant.phase_currents());
  if (has_voltage_) settle(voltage_, phases_of(plant.voltage_at(step)));
  settle(dc_link_, {plant.dc_link(), 0.0, 0.0});
  speed_state_ = begin_speed_sensor(speed_, plant.angle(), plant.speed(), step);
  angle_before_ = plant.angle();
}

void Sensors::follow(const Plant& plant, std::int64_t step) {
  if (current_.front().filtered) filter(current_, plant.phase_currents());
  if (has_voltage_ && voltage_.front().filtered) filter(voltage_, phases_of(plant.voltage_at(step)));
  if (has_dc_link_) filter(dc_link_, {plant.dc_link(), 0.0, 0.0});
  if (has_speed_) {
    if (speed_fault_ == Fault::no_signal && timing_.kind == SpeedSensorKind::encoder) return;
    const double angle = plant.angle() - angle_unseen_;
    advance(speed_state_, angle_before_, angle, plant.speed(), step - 1, speed_, timing_);
    angle_before_ = angle;
  }
}

void Sensors::set_speed_fault(Fault fault, const Plant& plant) {
  if (speed_fault_ == Fault::no_signal && fault != Fault::no_signal && timing_.kind == SpeedSensorKind::encoder) {
    const double per_rad = speed_.encoder.edges_per_rad;
    angle_unseen_ += floor((plant.angle() - angle_unseen_ - angle_before_) * per_rad) / per_rad;
    angle_before_ = plant.angle() - angle_unseen_;
  }
  speed_fault_ = fault;
}

const Reading& Sensors::read(const Plant& plant, std::int64_t tick) {
  std::size_t at = 0;
  const Phases<double> truth = plant.phase_currents();
  Phases<double> i;
  i.a = values_[at++] = convert_one(current_[0], truth.a, tick);
  i.b = values_[at++] = convert_one(current_[1], truth.b, tick);
  if (two_currents_) {
    reading_.current = clarke_two(i.a, i.b);
  } else {
    i.c = values_[at++] = convert_one(current_[2], truth.c, tick);
    reading_.current = clarke(i);
  }
  if (has_voltage_) {
    const Phases<double> u = convert_three(voltage_, phases_of(plant.voltage_at(tick * steps_per_tick_)), tick);
    reading_.voltage = clarke(u);
    values_[at++] = u.a;
    values_[at++] = u.b;
    values_[at++] = u.c;
  }
  reading_.dc_link = has_dc_link_ ? convert_one(dc_link_[0], plant.dc_link(), tick) : believed_dc_link_;
  if (!mains_) values_[at++] = reading_.dc_link;
  const bool noisy = timing_.kind == SpeedSensorKind::tachogenerator && tick >= 0;
  const double speed = read_speed(speed_state_, tick, noisy ? speed_noise_.at(noise_, tick) : 0.0, speed_, timing_);
  if (speed_fault_ == Fault::no_signal && timing_.kind != SpeedSensorKind::encoder)
    reading_.speed = 0.0;
  else if (speed_fault_ != Fault::stuck)
    reading_.speed = speed;
  if (has_speed_) values_[at++] = reading_.speed / rad_s_per_rpm;
  return reading_;
}

}  // namespace slipbench
