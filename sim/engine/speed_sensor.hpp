// The speed sensor of a drive: none, ideal, tachogenerator or encoder; what it tells at each control tick.
//
//   none            NaN
//   ideal           the true speed
//   tachogenerator  bandwidth and noise of an analog channel (analog_sensor.hpp), no converter
//   encoder         M/T evaluation (encoder.hpp); window: the nearest whole number of control periods
//
// Speeds in rad/s, mechanical; noise_rpm and bandwidth_Hz as the scenario gives them. The kind is structural:
// the same in all lanes.
#pragma once

#include <cstdint>
#include <limits>

#include "sim/engine/analog_sensor.hpp"
#include "sim/engine/encoder.hpp"

namespace slipbench {

enum class SpeedSensorKind { none, ideal, tachogenerator, encoder };

struct SpeedSensorData {
  SpeedSensorKind kind = SpeedSensorKind::none;
  double noise_rpm = 0.0, bandwidth_Hz = 0.0;  // tachogenerator
  EncoderData encoder;
  double window_s = 1e-3;  // encoder
};

// What does not depend on the number type.
struct SpeedSensorTiming {
  SpeedSensorKind kind = SpeedSensorKind::none;
  std::int64_t steps_per_tick = 1;  // plant steps in a control period
  std::int64_t ticks_per_window = 1;
  bool operator==(const SpeedSensorTiming&) const = default;
};

template <class Real>
struct SpeedSensor {
  AnalogSensor<Real> tachogenerator;
  Encoder<Real> encoder;
  SLIPBENCH_FIELDS(tachogenerator, encoder)
};

template <class Real>
struct SpeedSensorState {
  Real speed{};  // true, at the last plant step
  AnalogState<Real> tachogenerator;
  EncoderState<Real> encoder;
  SLIPBENCH_FIELDS(speed, tachogenerator, encoder)
};

inline SpeedSensorTiming speed_sensor_timing(const SpeedSensorData& data, std::int64_t steps_per_tick,
                                             double control_period_s) {
  const double nearest = floor(data.window_s / control_period_s + 0.5);
  return {data.kind, steps_per_tick, nearest < 1.0 ? 1 : static_cast<std::int64_t>(nearest)};
}

inline SpeedSensor<double> prepare_speed_sensor(const SpeedSensorData& data, double plant_step_s) {
  constexpr double rad_s_per_rpm = 6.283185307179586477 / 60.0;
  AnalogChannel tachogenerator;
  tachogenerator.noise_rms = data.noise_rpm * rad_s_per_rpm;
  tachogenerator.bandwidth_Hz = data.bandwidth_Hz;
  return {prepare_analog_sensor(tachogenerator, plant_step_s), prepare_encoder(data.encoder, plant_step_s)};
}

// Settled at this speed after `step` plant steps (negative where a run-in comes before t = 0).
inline SpeedSensorState<double> begin_speed_sensor(const SpeedSensor<double>& c, double angle_rad, double speed_rad_s,
                                                   std::int64_t step) {
  return {speed_rad_s, begin_analog(speed_rad_s), begin_encoder(c.encoder, angle_rad, speed_rad_s, step)};
}

// Plant step `step`: shaft angle before and after (mechanical, not wrapped), speed at its end.
template <class Real>
inline void advance(SpeedSensorState<Real>& state, const Real& angle_before_rad, const Real& angle_after_rad,
                    const Real& speed_after, std::int64_t step, const SpeedSensor<Real>& c,
                    const SpeedSensorTiming& timing) {
  state.speed = speed_after;
  if (timing.kind == SpeedSensorKind::tachogenerator) filter_step(state.tachogenerator, speed_after, c.tachogenerator);
  if (timing.kind == SpeedSensorKind::encoder)
    count_edges(state.encoder, angle_before_rad, angle_after_rad, step, c.encoder);
}

// Measured speed at control tick `tick`, called once a tick; `normal`: the noise of channel "speed" there.
template <class Real>
inline Real read_speed(SpeedSensorState<Real>& state, std::int64_t tick, const Real& normal, const SpeedSensor<Real>& c,
                       const SpeedSensorTiming& timing) {
  switch (timing.kind) {
    case SpeedSensorKind::ideal:
      return state.speed;
    case SpeedSensorKind::tachogenerator:
      return convert(state.tachogenerator, normal, c.tachogenerator).value;
    case SpeedSensorKind::encoder:
      if (tick % timing.ticks_per_window == 0) {
        return end_window(state.encoder, tick * timing.steps_per_tick, c.encoder);
      }
      return state.encoder.speed;
    case SpeedSensorKind::none:
      break;
  }
  return Real(std::numeric_limits<double>::quiet_NaN());
}

}  // namespace slipbench
