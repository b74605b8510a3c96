// Timed events of a run: which are due at a control tick, and the log of those that acted.
//
// An event acts at the first control tick at or after its time, before the sensors are read there; equal times act in file
// order. A run-in before t = 0 sees none. Set up once; a tick allocates nothing.
#pragma once

#include <cstdint>
#include <string>
#include <vector>

#include "sim/engine/fault.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

struct Event {
  enum class Kind { speed_sensor, current_sensor, speed_from };
  std::int64_t tick = 0;
  Kind kind = Kind::speed_sensor;
  Fault fault = Fault::none;  // of a sensor; none: repaired
  std::size_t phase = 0;      // of a current sensor: 0, 1, 2 for a, b, c
  std::string estimator;      // speed_from: its name, or "measured"
  std::string what;           // "speed sensor: no signal"
};

struct ActedEvent {
  std::int64_t tick = 0;
  double time_s = 0.0;  // of that tick
  std::string what;
};

class Events {
 public:
  explicit Events(const Scenario& scenario);
  // The next event due at this tick, one a call; nullptr when there is none (more).
  const Event* due(std::int64_t tick) {
    return acted_ < events_.size() && events_[acted_].tick <= tick ? &events_[acted_++] : nullptr;
  }
  [[nodiscard]] std::vector<ActedEvent> acted() const;

 private:
  double period_s_;
  std::vector<Event> events_;  // in the order they act
  std::size_t acted_ = 0;
};

}  // namespace slipbench
