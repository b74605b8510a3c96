#include "sim/scenario/check_wiring.hpp"

#include <algorithm>
#include <vector>

#include "sim/scenario/check.hpp"
#include "sim/scenario/nearest.hpp"

namespace slipbench {
namespace {

void check_estimator_names(const Scenario& s, const Node& root) {
  for (std::size_t i = 0; i < s.estimators.size(); ++i) {
    const std::string& name = s.estimators[i].name;
    const std::string key = "estimator." + std::to_string(i) + ".name";
    const bool clean = !name.empty() && name.size() <= 64 && std::all_of(name.begin(), name.end(), [](char c) {
      return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '_';
    });
    if (!clean) {
      refuse_at(root, key,
                "'" + key + "' is \"" + printable(name) +
                    "\"; a name is made of 1 to 64 letters, digits and _: it heads columns",
                "range");
    }
    if (name == "measured" || name == "plant") {
      const char* taken = name == "plant" ? "the truth" : "the sensors";
      refuse_at(root, key, "'" + key + "' is \"" + name + "\", which stands for " + taken + "; take another", "range");
    }
    for (std::size_t j = 0; j < i; ++j) {
      if (s.estimators[j].name == name)
        refuse_at(root, key, "'" + key + "': the name \"" + name + "\" is taken by estimator." + std::to_string(j));
    }
  }
}

void check_estimator_speed(const Scenario& s, const Node& root) {
  if (s.sensors.speed.kind != "none") return;
  for (std::size_t i = 0; i < s.estimators.size(); ++i) {
    if (!s.estimators[i].needs_speed()) continue;
    refuse_at(root, "estimator." + std::to_string(i) + ".kind",
              "'estimator." + std::to_string(i) + ".kind' is \"" + s.estimators[i].kind +
                  "\", which is told the speed, but there is no speed sensor; set sensors.speed.kind, or take an "
                  "estimator that finds the speed");
  }
}

void check_controller(const Scenario& s, const Node& root) {
  const ControllerSettings& c = s.controller;
  if (c.kind.empty()) {
    refuse_at(root, "controller.kind", "missing table [controller]: an inverter needs one to command it", "missing");
  }
  const bool speed = !s.reference.speed_rpm.empty(), torque = !s.reference.torque_Nm.empty();
  if (!speed && !torque) {
    refuse_at(root, "reference.speed_rpm",
              "missing key 'reference.speed_rpm' (or reference.torque_Nm): what the controller shall follow",
              "missing");
  }
  if (speed && torque) {
    refuse_at(root, "reference.torque_Nm",
              "'reference.torque_Nm' stands beside reference.speed_rpm; the controller follows one of them");
  }
  if (!c.takes_speed()) {
    if (torque) {
      refuse_at(root, "reference.torque_Nm",
                "'reference.torque_Nm' does not go with " + c.kind +
                    ", which holds a frequency; give reference.speed_rpm, or take rotor_flux_oriented");
    }
    return;
  }
  check_named(s, root, "controller.speed_from", c.speed_from, true);
  const bool direct = c.orientation == "direct";
  if (direct && c.flux_from.empty()) {
    refuse_at(root, "controller.flux_from",
              "missing key 'controller.flux_from': direct orientation needs the name of an estimator that gives the "
              "flux angle",
              "missing");
  }
  if (direct) check_named(s, root, "controller.flux_from", c.flux_from, false);
  if (!direct && !c.flux_from.empty()) {
    refuse_at(root, "controller.flux_from",
              "'controller.flux_from' goes with orientation = \"direct\" only; indirect orientation takes its angle "
              "from slip and speed");
  }
  if (c.speed_from == "measured" && s.sensors.speed.kind == "none") {
    refuse_at(root, "controller.speed_from",
              std::string("'controller.speed_from' is \"measured\", but there is no speed sensor; ") +
                  (speed    ? "the speed loop"
                   : direct ? "the current loop's decoupling"
                            : "indirect orientation") +
                  " needs one: set sensors.speed.kind, or name an estimator here");
  }
}

void check_supply(const Scenario& s, const Node& root) {
  if (!s.on_mains()) {
    check_controller(s, root);
    if (s.sensors.voltage.present) {
      refuse_at(
          root, "sensors.voltage",
          "[sensors.voltage] is for mains: with an inverter the estimators get the mean voltage believed applied");
    }
    if (s.sensors.dc_link.present && find(root, "belief.dc_link") != nullptr) {
      refuse_at(
          root, "belief.dc_link",
          "'belief.dc_link' stands beside [sensors.dc_link]: a measured DC link is not believed; drop one of them");
    }
    return;
  }
  const auto out_of_place = [&](const char* key, const std::string& reason) {
    if (find(root, key) != nullptr) refuse_at(root, key, "'" + std::string(key) + "' has no place on mains: " + reason);
  };
  out_of_place("controller", "there is no inverter to command");
  out_of_place("reference", "there is no controller to follow it");
  out_of_place("sensors.dc_link", "there is no DC link");
  out_of_place("belief.dc_link", "there is no DC link");
  if (!s.estimators.empty() && !s.sensors.voltage.present) {
    refuse_at(root, "sensors.voltage",
              "missing table [sensors.voltage]: on mains no one commands the voltage, so estimators must measure it",
              "missing");
  }
  if (s.run.start == "magnetised") {
    refuse_at(
        root, "run.start",
        "'run.start' is \"magnetised\"; mains cannot hold the flux up at rest; allowed are standstill and steady");
  }
}

void check_loads(const Scenario& s, const Node& root) {
  for (std::size_t i = 0; i < s.loads.size(); ++i) {
    if (s.loads[i].kind != "imposed_speed") continue;
    if (s.loads.size() > 1) {
      refuse_at(root, "load." + std::to_string(i) + ".kind",
                "an imposed speed stands beside other loads: the shaft equation is off, so they would do nothing");
    }
    const double first = s.loads[i].speed_rpm.front()[1];
    if (find(root, "run.initial_speed_rpm") != nullptr && s.run.initial_speed_rpm != first) {
      refuse_at(root, "run.initial_speed_rpm",
                "'run.initial_speed_rpm' is " + number_text(s.run.initial_speed_rpm) +
                    " rpm, but the imposed speed begins with " + number_text(first) + " rpm");
    }
  }
  const bool imposed =
      std::any_of(s.loads.begin(), s.loads.end(), [](const auto& l) { return l.kind == "imposed_speed"; });
  if (s.run.start == "magnetised" && s.run.initial_speed_rpm != 0.0 && !imposed) {
    refuse_at(root, "run.initial_speed_rpm",
              "'run.initial_speed_rpm' does not go with start = \"magnetised\", which is at rest; use \"standstill\" "
              "or \"steady\"");
  }
  if (s.run.start == "steady" && s.run.initial_speed_rpm != 0.0) {
    refuse_at(
        root, "run.initial_speed_rpm",
        "'run.initial_speed_rpm' does not go with start = \"steady\", which takes its speed from the equilibrium");
  }
}

void check_sensors(const Scenario& s, const Node& root) {
  const auto channel = [&](const AnalogSensorSettings& sensor, const std::string& name, const char* letter) {
    if (sensor.bits > 0 && !(sensor.range > 0.0)) {
      const std::string key = name + ".range_" + letter;
      refuse_at(root, key,
                "missing key '" + key + "': a converter of " + std::to_string(sensor.bits) + " bits needs its range",
                "missing");
    }
  };
  channel(s.sensors.current, "sensors.current", "A");
  channel(s.sensors.voltage, "sensors.voltage", "V");
  channel(s.sensors.dc_link, "sensors.dc_link", "V");
}

void check_drifts(const Scenario& s, const Node& root) {
  const Circuit<double> c = s.machine.circuit();
  for (std::size_t i = 0; i < s.drifts.size(); ++i) {
    const std::string& quantity = s.drifts[i].quantity;
    const std::string key = "drift." + std::to_string(i) + ".quantity";
    for (std::size_t j = 0; j < i; ++j) {
      if (s.drifts[j].quantity == quantity)
        refuse_at(root, key, "'" + key + "': " + quantity + " drifts already in drift." + std::to_string(j));
    }
    if (quantity == "dc_link" && s.on_mains()) refuse_at(root, key, "'" + key + "': there is no DC link on mains");
    if (quantity == "inertia" && !s.loads.empty() && s.loads.front().kind == "imposed_speed") {
      refuse_at(root, key, "'" + key + "': with an imposed speed the inertia does nothing");
    }
    if ((quantity == "stator_leakage" && c.stator_leakage == 0.0) ||
        (quantity == "rotor_leakage" && c.rotor_leakage == 0.0)) {
      refuse_at(root, key, "'" + key + "': the " + quantity + " of this circuit is 0; a factor on it does nothing");
    }
  }
}

}  // namespace

void check_named(const Scenario& s, const Node& root, const std::string& key, const std::string& name,
                 bool or_measured) {
  std::vector<std::string_view> names;
  if (or_measured) names.push_back("measured");
  for (const EstimatorSettings& e : s.estimators) names.push_back(e.name);
  if (std::count(names.begin(), names.end(), name) > 0) return;
  std::string list;
  for (const std::string_view n : names) list += (list.empty() ? "" : ", ") + std::string(n);
  if (list.empty())
    refuse_at(root, key, "'" + key + "' is \"" + printable(name) + "\", but the scenario has no [[estimator]]");
  refuse_at(root, key,
            "'" + key + "' is \"" + printable(name) + "\"; wanted is one of " + list + "; nearest is " +
                std::string(nearest(name, names)));
}

void check_wiring(const Scenario& s, const Node& root) {
  check_estimator_names(s, root);
  check_estimator_speed(s, root);
  check_supply(s, root);
  check_loads(s, root);
  check_sensors(s, root);
  check_drifts(s, root);
  check_events(s, root);
  if (s.belief.has_machine && s.belief.machine.pole_pairs != s.machine.pole_pairs) {
    refuse_at(root, "belief.file",
              "the believed machine has " + std::to_string(s.belief.machine.pole_pairs) + " pole pairs, the true one " +
                  std::to_string(s.machine.pole_pairs) + ": no belief is that wrong");
  }
}

}  // namespace slipbench
