#include "sim/engine/events.hpp"

#include <algorithm>

namespace slipbench {

namespace {

Event event_of(const EventSettings& e, double period_s) {
  Event event;
  event.tick = e.tick(period_s);
  if (e.kind == "speed_from") {
    event.kind = Event::Kind::speed_from;
    event.estimator = e.estimator;
    event.what = "speed from " + e.estimator;
    return event;
  }
  event.fault = e.fault == "no_signal" ? Fault::no_signal : e.fault == "stuck" ? Fault::stuck : Fault::none;
  const std::string state = e.fault == "no_signal" ? "no signal" : e.fault;
  if (e.kind == "current_sensor_fault") {
    event.kind = Event::Kind::current_sensor;
    event.phase = e.phase == "a" ? 0 : e.phase == "b" ? 1 : 2;
    event.what = "current sensor " + e.phase + ": " + state;
  } else {
    event.what = "speed sensor: " + state;
  }
  return event;
}

}  // namespace

Events::Events(const Scenario& s) : period_s_(s.run.control_period_s) {
  std::vector<EventSettings> ordered = s.events;
  std::stable_sort(ordered.begin(), ordered.end(), [](const auto& a, const auto& b) { return a.at_s < b.at_s; });
  for (const EventSettings& e : ordered) events_.push_back(event_of(e, period_s_));
}

std::vector<ActedEvent> Events::acted() const {
  std::vector<ActedEvent> log;
  for (std::size_t i = 0; i < acted_; ++i)
    log.push_back({events_[i].tick, static_cast<double>(events_[i].tick) * period_s_, events_[i].what});
  return log;
}

}  // namespace slipbench
