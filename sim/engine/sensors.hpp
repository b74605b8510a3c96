// All sensors of a scenario: what the control electronics knows of the drive at each control tick.
//
// A sensor may fail and be repaired under way:
//   no signal  current: its channel sees 0, so it reads offset and noise, still quantised; encoder: no edges arrive, and the
//              evaluation goes to 0 by its own rules (encoder.hpp); ideal sensor and tachogenerator read 0
//   stuck      the last reading stays
// A repaired encoder counts on from the edges it has seen: those that passed meanwhile are lost.
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "sim/engine/analog_sensor.hpp"
#include "sim/engine/events.hpp"
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

  // From the next reading on.
  void set_speed_fault(Fault fault, const Plant& plant);
  void set_current_fault(std::size_t phase, Fault fault) { current_[phase].fault = fault; }

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
    Fault fault = Fault::none;
    double last = 0.0;  // reading
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
  double believed_dc_link_ = 0.0, current_noise_ = 0.0;
  double angle_before_ = 0.0;  // of the shaft as the encoder counts it, rad
  double angle_unseen_ = 0.0;  // turned while the encoder gave no edges: a whole number of them
  Fault speed_fault_ = Fault::none;
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
