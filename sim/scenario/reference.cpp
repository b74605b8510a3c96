#include "sim/scenario/reference.hpp"

#include <type_traits>

#include "sim/scenario/tree.hpp"

namespace slipbench {
namespace {

// The slot of a fresh scenario: what it is made of, and what it holds.
struct Fresh {
  Scenario& scenario;
  KeyReference& row;

  template <class T>
  void operator()(T& (*slot)(Scenario&, std::size_t)) const {
    const T& value = slot(scenario, 0);
    if constexpr (std::is_same_v<T, Knots>) {
      row.holds = Holds::knots;
    } else if constexpr (std::is_same_v<T, std::array<double, 3>>) {
      row.holds = Holds::triple, row.fallback = value;
    } else if constexpr (std::is_same_v<T, std::string>) {
      row.holds = Holds::text;
      if (!value.empty()) row.fallback = value;
    } else if constexpr (std::is_same_v<T, bool>) {
      row.holds = Holds::truth, row.fallback = value;
    } else if constexpr (std::is_integral_v<T>) {
      row.holds = Holds::whole, row.fallback = static_cast<std::int64_t>(value);
    } else {
      row.holds = Holds::number, row.fallback = value;
    }
  }

  void operator()(const MethodSetting& method) const {
    const Setting& s = *method.setting;
    if (s.shape != SettingShape::number) {
      row.holds = s.shape == SettingShape::list ? Holds::list : Holds::matrices;
    } else if (!s.structural) {
      row.holds = Holds::number, row.fallback = s.fallback;
    } else if (s.low == 0.0 && s.high == 1.0) {
      row.holds = Holds::truth, row.fallback = s.fallback != 0.0;
    } else {
      row.holds = Holds::whole, row.fallback = static_cast<std::int64_t>(s.fallback);
    }
  }
};

std::string bounds_text(const Range& range) {
  const bool below = range.low <= -unlimited, above = range.high >= unlimited;
  if (below && above) return "any number";
  if (range.low == range.high) return number_text(range.low);
  const std::string low = below ? "" : number_text(range.low) + (range.open ? " < x" : " <= x");
  return (low.empty() ? "x" : low) + (above ? "" : " <= " + number_text(range.high));
}

std::string value_text(const KeyReference::Value& value) {
  struct Text {
    std::string operator()(std::monostate) const { return "none"; }
    std::string operator()(double x) const { return number_text(x); }
    std::string operator()(std::int64_t x) const { return std::to_string(x); }
    std::string operator()(bool x) const { return x ? "true" : "false"; }
    std::string operator()(const std::string& x) const { return x; }
    std::string operator()(const std::array<double, 3>& x) const {
      return "[" + number_text(x[0]) + ", " + number_text(x[1]) + ", " + number_text(x[2]) + "]";
    }
  };
  return std::visit(Text{}, value);
}

}  // namespace

std::string KeyReference::allowed_text() const {
  switch (holds) {
    case Holds::number:
      return bounds_text(key->range);
    case Holds::whole:
      return "whole, " + bounds_text(key->range);
    case Holds::truth:
      return "true | false";
    case Holds::knots:
      return "[[time, x], ...], " + bounds_text(key->range);
    case Holds::triple:
      return "[x, x, x], " + bounds_text(key->range);
    case Holds::list:
      return "[x, ...], " + bounds_text(key->range);
    case Holds::matrices:
      return "[[[x, ...], ...], ...], " + bounds_text(key->range);
    case Holds::text:
      break;
  }
  std::string words;
  for (const std::string_view word : key->words) words += (words.empty() ? "" : " | ") + std::string(word);
  return words.empty() ? "text" : words;
}

std::string KeyReference::default_text() const {
  if (key->need == Need::required) return "required";
  return key->otherwise.empty() ? value_text(fallback) : std::string(key->otherwise);
}

std::string SectionReference::head() const {
  if (section->path.empty()) return "";
  std::string name(section->path);
  if (!section->is_list()) return "[" + name + "]";
  name.resize(name.size() - 2);
  return "[[" + name + "]]";
}

std::vector<SectionReference> scenario_reference() {
  Scenario fresh;
  for (const Section& section : scenario_sections()) {
    if (section.is_list()) section.enter(fresh, 1);
  }
  std::vector<SectionReference> sections;
  for (const Section& section : scenario_sections()) {
    SectionReference rows{&section, {}};
    for (const Key& key : scenario_keys()) {
      if (key.section() != section.path) continue;
      KeyReference& row = rows.keys.emplace_back();
      row.key = &key;
      std::visit(Fresh{fresh, row}, key.slot);
      if (key.need == Need::required || !key.otherwise.empty()) row.fallback = std::monostate();
    }
    sections.push_back(std::move(rows));
  }
  return sections;
}

std::string first_element(const std::string& path) {
  std::string out = path;
  for (std::size_t at = out.find("[]"); at != std::string::npos; at = out.find("[]")) out.replace(at, 2, ".0");
  return out;
}

}  // namespace slipbench
