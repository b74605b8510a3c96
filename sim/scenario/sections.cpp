// The tables of a scenario file, and how a dotted key finds its row.
#include <algorithm>
#include <charconv>

#include "sim/scenario/input_error.hpp"
#include "sim/scenario/keys.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

const std::vector<Section>& scenario_sections() {
  static const std::vector<Section> table = {
      {.path = "", .meaning = "the file as a whole"},
      {.path = "run", .need = Need::required, .meaning = "time steps, method and start"},
      {.path = "machine",
       .need = Need::required,
       .selector = "circuit",
       .rest_from = "file",
       .meaning = "equivalent circuit and nameplate"},
      {.path = "shaft", .need = Need::required, .meaning = "inertia and friction"},
      {.path = "load[]",
       .selector = "kind",
       .enter = [](Scenario& s, std::size_t count) { s.loads.resize(count); },
       .meaning = "loads, added up"},
      {.path = "supply", .need = Need::required, .selector = "kind", .meaning = "mains or inverter"},
      {.path = "process_noise", .meaning = "noise that drives the plant"},
      {.path = "sensors", .meaning = "what is measured, and how well"},
      {.path = "sensors.current",
       .enter = [](Scenario& s, std::size_t) { s.sensors.current.present = true; },
       .meaning = "line current sensors"},
      {.path = "sensors.voltage",
       .enter = [](Scenario& s, std::size_t) { s.sensors.voltage.present = true; },
       .meaning = "phase voltage sensors (mains)"},
      {.path = "sensors.dc_link",
       .enter = [](Scenario& s, std::size_t) { s.sensors.dc_link.present = true; },
       .meaning = "DC-link voltage sensor"},
      {.path = "sensors.speed", .selector = "kind", .meaning = "speed sensor"},
      {.path = "reference", .meaning = "what the controller is asked for"},
      {.path = "controller", .selector = "kind", .meaning = "control method and its settings"},
      {.path = "estimator[]",
       .selector = "kind",
       .enter = [](Scenario& s, std::size_t count) { s.estimators.resize(count); },
       .meaning = "estimators that ride along"},
      {.path = "belief", .meaning = "what controller and estimators believe, as factors on the truth"},
      {.path = "drift[]",
       .enter = [](Scenario& s, std::size_t count) { s.drifts.resize(count); },
       .meaning = "the true machine changing under way"},
      {.path = "event[]",
       .selector = "kind",
       .enter = [](Scenario& s, std::size_t count) { s.events.resize(count); },
       .meaning = "what happens at a time: sensors fail, the speed is taken from elsewhere"},
      {.path = "score", .meaning = "window and thresholds of the figures"},
  };
  return table;
}

const Section* find_section(std::string_view path) {
  for (const Section& section : scenario_sections()) {
    if (section.path == path) return &section;
  }
  return nullptr;
}

std::string Range::text() const {
  const bool below = low <= -unlimited, above = high >= unlimited;
  const std::string floor = (open ? "above " : "of at least ") + number_text(low);
  const std::string ceiling = "at most " + number_text(high);
  if (below) return above ? "" : "of " + ceiling;
  if (low == high) return "equal to " + number_text(low);
  if (above) return floor;
  return open ? floor + " and " + ceiling : "from " + number_text(low) + " to " + number_text(high);
}

std::string_view Key::section() const {
  const std::size_t dot = path.rfind('.');
  return dot == std::string::npos ? std::string_view() : std::string_view(path).substr(0, dot);
}

std::string_view Key::name() const {
  const std::size_t dot = path.rfind('.');
  return std::string_view(path).substr(dot == std::string::npos ? 0 : dot + 1);
}

namespace {

struct AllowedText {
  const Key& key;
  [[nodiscard]] std::string ranged(const std::string& what) const {
    const std::string bounds = key.range.text();
    return what + (bounds.empty() ? "" : " " + bounds) + (key.unit.empty() ? "" : " (" + std::string(key.unit) + ")");
  }
  std::string operator()(double& (*)(Scenario&, std::size_t)) const { return ranged("a number"); }
  std::string operator()(std::int64_t& (*)(Scenario&, std::size_t)) const { return ranged("a whole number"); }
  std::string operator()(std::uint64_t& (*)(Scenario&, std::size_t)) const { return "a whole number of at least 0"; }
  std::string operator()(bool& (*)(Scenario&, std::size_t)) const { return "true or false"; }
  std::string operator()(Knots& (*)(Scenario&, std::size_t)) const {
    return "knots [[time in s, value], ...] in order of time, each value " + ranged("a number");
  }
  std::string operator()(std::array<double, 3>& (*)(Scenario&, std::size_t)) const {
    return "three numbers [a, b, c], each " + ranged("a number");
  }
  std::string operator()(const MethodSetting& method) const {
    switch (method.setting->shape) {
      case SettingShape::number:
        break;
      case SettingShape::list:
        return "a list [x, ...], each " + ranged("a number");
      case SettingShape::matrices:
        return "a list of matrices of one size [[[x, ...], ...], ...], each element " + ranged("a number");
    }
    return ranged("a number");
  }
  std::string operator()(std::string& (*)(Scenario&, std::size_t)) const {
    if (key.words.empty()) return "a string";
    std::string list;
    for (const std::string_view word : key.words) list += (list.empty() ? "" : ", ") + std::string(word);
    return key.words.size() == 1 ? "\"" + list + "\"" : "one of " + list;
  }
};

}  // namespace

std::string Key::allowed() const { return std::visit(AllowedText{*this}, slot); }

KeyPath row_path(std::string_view dotted) {
  KeyPath out;
  while (!dotted.empty()) {
    const std::size_t dot = dotted.find('.');
    const std::string_view part = dotted.substr(0, dot);
    dotted = dot == std::string_view::npos ? std::string_view() : dotted.substr(dot + 1);
    std::size_t index = 0;
    const auto [end, error] = std::from_chars(part.data(), part.data() + part.size(), index);
    if (!out.path.empty() && error == std::errc() && end == part.data() + part.size()) {
      out.path += "[]", out.index = index;
    } else {
      out.path += (out.path.empty() ? "" : ".") + std::string(part);
    }
  }
  return out;
}

const Key* find_key(Scenario& scenario, std::string_view dotted) {
  const KeyPath at = row_path(dotted);
  const std::size_t lists = at.path.starts_with("load[]")        ? scenario.loads.size()
                            : at.path.starts_with("estimator[]") ? scenario.estimators.size()
                            : at.path.starts_with("drift[]")     ? scenario.drifts.size()
                            : at.path.starts_with("event[]")     ? scenario.events.size()
                                                                 : 1;
  if (at.index >= lists) return nullptr;
  for (const Key& key : scenario_keys()) {
    if (key.path != at.path) continue;
    if (key.when.empty()) return &key;
    const std::string selector = std::string(key.section()) + "." + std::string(find_section(key.section())->selector);
    for (const Key& choice : scenario_keys()) {
      if (choice.path != selector) continue;
      const auto text = std::get<std::string& (*)(Scenario&, std::size_t)>(choice.slot);
      if (std::count(key.when.begin(), key.when.end(), text(scenario, at.index)) > 0) return &key;
    }
  }
  return nullptr;
}

bool set_number(Scenario& scenario, std::string_view dotted, double value) {
  const Key* key = find_key(scenario, dotted);
  if (key == nullptr || key->structural) return false;
  const std::size_t i = row_path(dotted).index;
  const auto checked = [&] {
    if (!key->range.holds(value)) {
      throw InputError("", std::string(dotted),
                       "'" + std::string(dotted) + "' is " + number_text(value) + "; allowed is " + key->allowed(),
                       "range");
    }
    return value;
  };
  if (const auto* real = std::get_if<double& (*)(Scenario&, std::size_t)>(&key->slot)) {
    (*real)(scenario, i) = checked();
    return true;
  }
  if (const auto* method = std::get_if<MethodSetting>(&key->slot)) {
    if (method->setting->shape != SettingShape::number) return false;
    method->of(scenario, i).set(std::string(method->setting->name), checked());
    return true;
  }
  return false;
}

}  // namespace slipbench
