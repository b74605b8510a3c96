// Events against the scenario they happen in.
#include <algorithm>
#include <numeric>

#include "sim/scenario/check.hpp"
#include "sim/scenario/check_wiring.hpp"

namespace slipbench {
namespace {

std::string key_of(std::size_t event, const char* name) { return "event." + std::to_string(event) + "." + name; }

void check_time(const Scenario& s, const Node& root, std::size_t i) {
  const double T = s.run.control_period_s, tick = static_cast<double>(s.events[i].tick(T));
  if (tick * T <= s.run.duration_s * (1.0 + 1e-9)) return;
  refuse_at(root, key_of(i, "at_s"),
            "'" + key_of(i, "at_s") + "' is " + number_text(s.events[i].at_s) +
                " s; the run has no control tick from " + "then on: it ends at " + number_text(s.run.duration_s) +
                " s");
}

void check_sensor(const Scenario& s, const Node& root, std::size_t i) {
  const EventSettings& e = s.events[i];
  if (e.kind == "speed_sensor_fault" && s.sensors.speed.kind == "none") {
    refuse_at(root, key_of(i, "kind"),
              "'" + key_of(i, "kind") +
                  "' is \"speed_sensor_fault\", but there is no speed sensor that could fail: set "
                  "sensors.speed.kind, or drop the event");
  }
  if (e.kind == "current_sensor_fault" && e.phase == "c" && s.sensors.current_phases == 2) {
    refuse_at(
        root, key_of(i, "phase"),
        "'" + key_of(i, "phase") + "' is \"c\"; with sensors.current.phases = 2 there are sensors in a and b only");
  }
}

void check_source(const Scenario& s, const Node& root, std::size_t i) {
  const EventSettings& e = s.events[i];
  if (e.kind != "speed_from") return;
  if (s.on_mains()) {
    refuse_at(root, key_of(i, "kind"),
              "'" + key_of(i, "kind") +
                  "' is \"speed_from\", which has no place on mains: there is no controller that "
                  "takes a speed");
  }
  if (!s.controller.takes_speed()) {
    refuse_at(root, key_of(i, "kind"),
              "'" + key_of(i, "kind") + "' is \"speed_from\", but " + s.controller.kind + " takes a speed from nobody");
  }
  check_named(s, root, key_of(i, "estimator"), e.estimator, true);
  if (e.estimator == "measured" && s.sensors.speed.kind == "none") {
    refuse_at(root, key_of(i, "estimator"),
              "'" + key_of(i, "estimator") +
                  "' is \"measured\", but there is no speed sensor: set sensors.speed.kind, or "
                  "name an estimator");
  }
}

// In order of time: nothing is repaired that is whole.
void check_repairs(const Scenario& s, const Node& root) {
  std::vector<std::size_t> order(s.events.size());
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::stable_sort(order.begin(), order.end(),
                   [&](std::size_t a, std::size_t b) { return s.events[a].at_s < s.events[b].at_s; });
  std::vector<std::string> broken;
  for (const std::size_t i : order) {
    const EventSettings& e = s.events[i];
    if (e.fault.empty()) continue;
    const std::string sensor = e.kind + e.phase;
    const auto known = std::find(broken.begin(), broken.end(), sensor);
    if (e.fault != "repaired") {
      if (known == broken.end()) broken.push_back(sensor);
      continue;
    }
    if (known == broken.end()) {
      refuse_at(root, key_of(i, "fault"),
                "'" + key_of(i, "fault") + "' is \"repaired\", but no event before " + number_text(e.at_s) +
                    " s breaks that sensor");
    }
    broken.erase(known);
  }
}

}  // namespace

void check_events(const Scenario& s, const Node& root) {
  for (std::size_t i = 0; i < s.events.size(); ++i) {
    check_time(s, root, i);
    check_sensor(s, root, i);
    check_source(s, root, i);
  }
  check_repairs(s, root);
}

}  // namespace slipbench
