// All sensors of a run: what the control electronics knows of the drive at each control tick, for one case or for a pack.
//
// A sensor may fail and be repaired under way, in all lanes alike:
//   no signal  current: its channel sees 0, so it reads offset and noise, still quantised; encoder: no edges arrive, and the
//              evaluation goes to 0 by its own rules (encoder.hpp); ideal sensor and tachogenerator read 0
//   stuck      the last reading stays
// A repaired encoder counts on from the edges it has seen: those that passed meanwhile are lost.
#pragma once

#include <array>
#include <span>

#include "sim/engine/analog_sensor.hpp"
#include "sim/engine/fault.hpp"
#include "sim/engine/noise_pack.hpp"
#include "sim/engine/plant.hpp"
#include "sim/engine/side_by_side.hpp"

namespace slipbench {

template <class Real>
class Sensors {
 public:
  explicit Sensors(Cases cases);

  // Settled at the plant's state, before plant step `step`.
  void begin(const Plant<Real>& plant, std::int64_t step);
  // After a plant step that ended at `step` (filters, encoder).
  void track(const Plant<Real>& plant, std::int64_t step) {
    if (tracks_) follow(plant, step);
  }
  // The sample at control tick `tick`; noise only from tick 0 on.
  const Reading<Real>& read(const Plant<Real>& plant, std::int64_t tick);

  // From the next reading on.
  void set_speed_fault(Fault fault, const Plant<Real>& plant);
  void set_current_fault(std::size_t phase, Fault fault) { current_[phase].fault = fault; }

  [[nodiscard]] const Reading<Real>& reading() const { return reading_; }
  [[nodiscard]] std::span<const Real> values() const { return {values_.data(), value_count_}; }  // in column order
  [[nodiscard]] const Real& clipped() const { return clipped_; }                                 // readings, counted
  // Edges that the encoder's counter shows, a whole number: none pass without a signal, a stuck counter stays.
  [[nodiscard]] Real encoder_edges() const {
    return speed_fault_ == Fault::stuck ? edges_held_ : floor(angle_before_ * c_.speed.encoder.edges_per_rad);
  }
  void save(SensorState<double>& to, std::size_t lane) const;

 private:
  struct Channel {
    AnalogSensor<Real> sensor;
    AnalogState<Real> state;
    NoiseStream<Real> noise;
    bool filtered, noisy;
    Fault fault = Fault::none;
    Real last{};  // reading
  };
  using Three = std::array<Channel, 3>;

  static Channel channel(const AnalogSensor<Real>& sensor, const AnalogState<Real>& state, bool filtered,
                         std::string_view name) {
    return {sensor, state, NoiseStream<Real>(NoiseChannel(name)), filtered, any(Real(0.0) < sensor.noise_rms)};
  }
  static Three channels(const std::array<AnalogSensor<Real>, 3>& sensors,
                        const std::array<AnalogState<Real>, 3>& states, bool filtered,
                        const std::array<std::string_view, 3>& names) {
    return {channel(sensors[0], states[0], filtered, names[0]), channel(sensors[1], states[1], filtered, names[1]),
            channel(sensors[2], states[2], filtered, names[2])};
  }
  static void filter(Channel& channel, const Real& x) {
    filter_step(channel.state, channel.fault == Fault::no_signal ? Real(0.0) : x, channel.sensor);
  }
  static void filter(Three& channels, const Phases<Real>& x) {
    filter(channels[0], x.a);
    filter(channels[1], x.b);
    filter(channels[2], x.c);
  }
  [[gnu::flatten]] void follow(const Plant<Real>& plant, std::int64_t step);
  Real convert_one(Channel& channel, const Real& input, std::int64_t tick);

  SensorShape shape_;
  bool mains_, tracks_;  // tracks_: some sensor has a memory between control ticks
  SensorNumbers<Real> c_;
  NoisePack<Real> noise_;
  Three current_, voltage_;
  Channel dc_link_;
  SpeedSensorState<Real> speed_state_;
  Real angle_before_;  // of the shaft as the encoder counts it, rad
  Real edges_held_{};
  Real angle_unseen_{};  // turned while the encoder gave no edges: a whole number of them
  Fault speed_fault_ = Fault::none;
  NoiseStream<Real> speed_noise_{NoiseChannel("speed")};
  Reading<Real> reading_;
  std::array<Real, 8> values_{};  // three currents, three voltages, DC link, speed at most
  std::size_t value_count_;
  Real clipped_{};
};

}  // namespace slipbench

#include "sim/engine/sensor_reading.hpp"
