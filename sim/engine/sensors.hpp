// All sensors of a scenario: what the control electronics knows of the drive at each control tick.
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "sim/engine/analog_sensor.hpp"
#include "sim/engine/noise.hpp"
#include "sim/engine/plant.hpp"
#include "sim/engine/speed_sensor.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

struct Reading {
  Vec2<double> current;  // A
  Vec2<double> voltage;  // V, on mains; 0 with an inverter
  double dc_link = 0.0;  // V; NaN on mains
  double speed = 0.0;    // mechanical rad/s; NaN without a sensor
};

class Sensors {
 public:
  Sensors(const Scenario& scenario, std::uint32_t noise_run);

  // Settled at the plant's state, before plant step `step`.
  void begin(const Plant& plant, std::int64_t step);
  // After a plant step that ended at `step` (filters, encoder).
  void track(const Plant& plant, std::int64_t step) {
    if (tracks_) follow(plant, step);
  }
  // The sample at control tick `tick`; noise only from tick 0 on.
  const Reading& read(const Plant& plant, std::int64_t tick);

  [[nodiscard]] std::vector<Column> columns() const;
  [[nodiscard]] std::span<const double> values() const { return values_; }
  [[nodiscard]] std::int64_t clipped() const { return clipped_; }
  [[nodiscard]] double current_noise() const { return current_noise_; }  // rms of a phase, rounding included, A

 private:
  struct Channel {
    AnalogSensor<double> sensor;
    AnalogState<double> state;
    NoiseStream noise;
    bool filtered;
  };
  using Three = std::vector<Channel>;

  static Three channels(const AnalogSensorSettings& s, double step_s, const std::array<std::string_view, 3>& names);
  static void settle(Three& channels, const Phases<double>& x);
  static void filter(Three& channels, const Phases<double>& x);
  void follow(const Plant& plant, std::int64_t step);
  double convert_one(Channel& channel, double input, std::int64_t tick);
  Phases<double> convert_three(Three& channels, const Phases<double>& x, std::int64_t tick);

  bool mains_, two_currents_, has_voltage_, has_dc_link_, has_speed_;
  bool tracks_ = false;  // some sensor has a memory between control ticks
  std::int64_t steps_per_tick_;
  double believed_dc_link_ = 0.0, current_noise_ = 0.0, angle_before_ = 0.0;
  Three current_, voltage_, dc_link_;
  SpeedSensorTiming timing_;
  SpeedSensor<double> speed_;
  SpeedSensorState<double> speed_state_;
  Noise noise_;
  NoiseStream speed_noise_;
  Reading reading_;
  std::vector<double> values_;
  std::int64_t clipped_ = 0;
};

}  // namespace slipbench
