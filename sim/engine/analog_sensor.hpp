// One measured analog channel: bandwidth, gain error, offset, noise, and a converter that rounds and clips.
//
//   filter     dy/dt = 2 pi f_0 (x - y), x taken as a straight line over each plant step h:
//              y1 = x1 + r (y0 - x0) - g (x1 - x0),  r = e^{-a},  g = (1 - r) / a,  a = 2 pi f_0 h
//   amplifier  v = (1 + gain_error) y + offset + noise_rms n,  n standard normal
//   converter  code = floor(v / lsb + 1/2), clipped to [-2^(bits-1), 2^(bits-1) - 1];  reading = code lsb
//              lsb = range / 2^(bits-1)
//
// x, y, v, lsb and range (peak) in the unit of the measured quantity; f_0 Hz; h s. The filter is exact for a
// constant and for a ramp, and of second order in h for anything smooth; f_0 = 0: none. bits = 0: no
// converter. Full scale itself is one code too many and clips, as in two's complement. A unipolar quantity
// (DC link) uses the same signed converter, so half its codes lie idle. Equations: common practice (mid-tread
// converter).
#pragma once

#include <cstdint>
#include <limits>

#include "plant/math/elementary.hpp"
#include "plant/math/fields.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

// A channel as its data sheet tells it.
struct AnalogChannel {
  double noise_rms = 0.0;     // before the converter
  double bandwidth_Hz = 0.0;  // 0: none
  double gain_error = 0.0;    // fraction
  double offset = 0.0;
  std::int64_t bits = 0;  // 0: ideal; up to 32
  double range = 0.0;     // peak, with bits
};

template <class Real>
struct AnalogSensor {
  Real keep{}, slope{};  // r, g
  Real gain{}, offset{}, noise_rms{};
  Real lsb{};  // 0: ideal
  Real code_low{}, code_high{};
  SLIPBENCH_FIELDS(keep, slope, gain, offset, noise_rms, lsb, code_low, code_high)
};

template <class Real>
struct AnalogState {
  Real input{}, filtered{};  // x0, y0
  SLIPBENCH_FIELDS(input, filtered)
};

template <class Real>
struct AnalogReading {
  Real value{};
  Real clipped{};  // 1 where the converter was at its end, else 0
  SLIPBENCH_FIELDS(value, clipped)
};

inline double converter_step(const AnalogChannel& channel) {
  return channel.bits > 0 ? channel.range / static_cast<double>(std::int64_t{1} << (channel.bits - 1)) : 0.0;
}

// Rms of all that is random in a reading, rounding counted as uniform over one lsb: what a filter should be
// told.
inline double total_noise_rms(const AnalogChannel& channel) {
  const double lsb = converter_step(channel);
  return sqrt(channel.noise_rms * channel.noise_rms + lsb * lsb / 12.0);
}

inline AnalogSensor<double> prepare_analog_sensor(const AnalogChannel& channel, double plant_step_s) {
  AnalogSensor<double> sensor;
  if (channel.bandwidth_Hz > 0.0) {
    const double a = 6.283185307179586477 * channel.bandwidth_Hz * plant_step_s;
    sensor.keep = exp(-a);
    sensor.slope = (1.0 - sensor.keep) / a;
  }
  sensor.gain = 1.0 + channel.gain_error;
  sensor.offset = channel.offset;
  sensor.noise_rms = channel.noise_rms;
  sensor.lsb = converter_step(channel);
  constexpr double unlimited = std::numeric_limits<double>::max();
  const double codes = channel.bits > 0 ? static_cast<double>(std::int64_t{1} << (channel.bits - 1)) : unlimited;
  sensor.code_low = -codes;
  sensor.code_high = channel.bits > 0 ? codes - 1.0 : unlimited;
  return sensor;
}

// The filter at rest at `input`.
template <class Real>
inline AnalogState<Real> begin_analog(const Real& input) {
  return {input, input};
}

// One plant step: `input` is the quantity at the step's end.
template <class Real>
inline void filter_step(AnalogState<Real>& state, const Real& input, const AnalogSensor<Real>& c) {
  state.filtered = input + c.keep * (state.filtered - state.input) - c.slope * (input - state.input);
  state.input = input;
}

// One sample at a control tick; `normal` is the channel's noise at that tick. What is not finite passes
// through, so that the end of the range does not hide a divergence.
template <class Real>
inline AnalogReading<Real> convert(const AnalogState<Real>& state, const Real& normal, const AnalogSensor<Real>& c) {
  const Real zero(0.0), one(1.0);
  const Real v = c.gain * state.filtered + c.offset + c.noise_rms * normal;
  const Real code = floor(v / select(zero < c.lsb, c.lsb, one) + Real(0.5));
  const Real rounded = select(zero < c.lsb, clamp(code, c.code_low, c.code_high) * c.lsb, v);
  return {select(is_finite(v), rounded, v), select(code < c.code_low, one, select(c.code_high < code, one, zero))};
}

}  // namespace slipbench
