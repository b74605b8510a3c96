#include "sim/scenario/system_design.hpp"

#include <algorithm>
#include <array>

#include "sim/scenario/fill.hpp"
#include "sim/scenario/matrix_node.hpp"
#include "sim/scenario/nearest.hpp"

namespace slipbench {
namespace {

constexpr std::array<std::string_view, 5> kinds = {"lqr", "place", "observer", "kalman", "pi"};

using Holds = DesignKey::Holds;
constexpr DesignKey keys[] = {
    {"kind", "lqr place observer kalman pi", Holds::kind, "what is designed"},
    {"Q", "lqr observer kalman", Holds::matrix, "weight of the states, symmetric"},
    {"R", "lqr observer kalman", Holds::matrix, "weight of the controlled inputs, symmetric"},
    {"N", "lqr observer kalman", Holds::matrix, "cross term, a row a state"},
    {"Q_integral", "lqr", Holds::matrix, "weight of the tracked outputs' integrals: integral action"},
    {"tracked_outputs", "lqr place observer kalman", Holds::names, "outputs that a reference is for; default: all"},
    {"controlled_inputs", "lqr place observer kalman", Holds::names, "inputs that the gain drives; default: all"},
    {"poles", "place observer", Holds::poles, "wished poles: the controller's (place), the observer's (observer)"},
    {"controller_poles", "observer kalman", Holds::poles, "poles of the controller beside an observer"},
    {"observer_poles", "lqr place", Holds::poles, "poles of the observer beside a controller"},
    {"faster_than_controller", "lqr place observer", Holds::positive,
     "the observer's poles so many times further out than the controller's; 2 to 5 is common practice"},
    {"W", "lqr place kalman", Holds::matrix, "noise of the states: intensity, discrete: covariance"},
    {"V", "lqr place kalman", Holds::matrix, "noise of the outputs: intensity, discrete: covariance"},
    {"rule", "pi", Holds::rule, "how the PI controller is tuned"},
    {"plant_gain", "pi", Holds::number, "gain of the plant; default: its DC gain"},
    {"large_lag_s", "pi", Holds::positive, "large lag, or integration time; default: of the slowest pole"},
    {"small_lag_s", "pi", Holds::positive, "sum of the small lags; default: of the other poles"},
    {"symmetric_factor", "pi", Holds::positive, "a of the symmetric optimum, above 1; default 2"},
};
constexpr std::string_view rules[] = {"magnitude_optimum", "symmetric_optimum"};

std::vector<std::string_view> known_keys() {
  std::vector<std::string_view> names;
  for (const DesignKey& key : keys) names.push_back(key.name);
  return names;
}

// What goes with the kind. A kind from --set leaves the file's keys for another aside; a kind of the file refuses them.
Node of_kind(const Node& node, const TableReader& t, const std::string& kind) {
  const bool kind_was_set = t.child("kind")->place.line == 0;
  Node kept = node;
  kept.children.clear();
  for (const Node& child : node.children) {
    const DesignKey& key =
        *std::find_if(std::begin(keys), std::end(keys), [&](const DesignKey& k) { return k.name == child.name; });
    if (key.goes_with(kind)) {
      kept.children.push_back(child);
    } else if (!kind_was_set || child.place.line == 0) {
      std::string others(key.kinds);
      for (std::size_t at = 0; (at = others.find(' ', at)) != std::string::npos; at += 2) others.replace(at, 1, ", ");
      refuse(child.name_place, t.dotted(child.name),
             "'" + t.dotted(child.name) + "' does not go with kind = \"" + kind + "\"; it belongs to " + others,
             "relation");
    }
  }
  return kept;
}

void not_both(const TableReader& t, const char* one, const char* other) {
  const Node* second = t.child(other);
  if (t.child(one) == nullptr || second == nullptr) return;
  refuse(second->name_place, t.dotted(other),
         "'" + t.dotted(other) + "' does not go with " + t.dotted(one) + ": give one of them", "relation");
}

// Numbers of the outputs (inputs) that the list at `key` names; all of them where there is no such list.
std::vector<Eigen::Index> chosen(const TableReader& t, const std::string& key, const std::vector<std::string>& names) {
  std::vector<Eigen::Index> numbers;
  if (t.child(key) == nullptr) {
    for (std::size_t i = 0; i < names.size(); ++i) numbers.push_back(static_cast<Eigen::Index>(i));
    return numbers;
  }
  const std::vector<std::string_view> known(names.begin(), names.end());
  const std::vector<std::string> wanted = read_names(t, key, {});
  for (std::size_t i = 0; i < wanted.size(); ++i) {
    const auto found = std::find(names.begin(), names.end(), wanted[i]);
    if (found == names.end())
      t.wrong(t.child(key)->children[i], key + "." + std::to_string(i),
              "a name of [system]; the nearest is " + std::string(nearest(wanted[i], known)), "range");
    numbers.push_back(found - names.begin());
  }
  if (numbers.empty()) t.wrong(*t.child(key), key, "one name at least", "range");
  return numbers;
}

void choose(DesignRequest& d, const TableReader& t, const linear::System& s) {
  std::vector<std::string> outputs, inputs;
  for (Eigen::Index i = 0; i < s.outputs(); ++i) outputs.push_back(s.output_name(i));
  for (Eigen::Index i = 0; i < s.inputs(); ++i) inputs.push_back(s.input_name(i));
  d.tracked = chosen(t, "tracked_outputs", outputs);
  d.controlled = chosen(t, "controlled_inputs", inputs);
}

std::optional<double> positive(const TableReader& t, const char* name, double low = 0.0) {
  if (t.child(name) == nullptr) return {};
  const double x = t.number(name);
  if (!(x > low) || x > 1e9)
    t.wrong(*t.child(name), name, "a number above " + short_text(low) + ", at most 1e+09", "range");
  return x;
}

void read_matrices(DesignRequest& d, const TableReader& t, const linear::System& s) {
  const Side states{s.order(), "the system's order"},
      inputs{static_cast<Eigen::Index>(d.controlled.size()), "as there are controlled inputs"},
      outputs{s.outputs(), "as it has outputs"};
  const bool weights =
      d.kind == DesignKind::lqr || t.child("Q") != nullptr || t.child("R") != nullptr || t.child("N") != nullptr;
  if (weights) {
    d.Q = read_symmetric(t, "Q", states);
    d.R = read_symmetric(t, "R", inputs);
    if (t.child("N") != nullptr) d.N = read_matrix(t, "N", states, inputs);
  }
  if (t.child("Q_integral") != nullptr)
    d.Q_integral =
        read_symmetric(t, "Q_integral", {static_cast<Eigen::Index>(d.tracked.size()), "as there are tracked outputs"});
  if (d.kind == DesignKind::kalman || t.child("W") != nullptr || t.child("V") != nullptr) {
    d.W = read_symmetric(t, "W", states);
    d.V = read_symmetric(t, "V", outputs);
  }
}

}  // namespace

bool DesignKey::goes_with(std::string_view kind) const {
  return (" " + std::string(kinds) + " ").find(" " + std::string(kind) + " ") != std::string::npos;
}

std::span<const DesignKey> design_keys() { return keys; }
std::span<const std::string_view> design_kinds() { return kinds; }
std::span<const std::string_view> pi_rules() { return rules; }

std::string_view name_of(DesignKind kind) { return kinds[static_cast<std::size_t>(kind)]; }

DesignRequest read_design(const Node& node, const linear::System& s) {
  const TableReader all(node, "design", known_keys());
  DesignRequest d;
  d.place = node.place.text();
  const std::string kind = all.word("kind", {kinds.begin(), kinds.end()});
  d.kind = static_cast<DesignKind>(std::find(kinds.begin(), kinds.end(), kind) - kinds.begin());
  const Node kept = of_kind(node, all, kind);
  const TableReader t(kept, "design", known_keys());
  if (d.kind == DesignKind::pi) {
    d.rule = t.word("rule", {std::begin(rules), std::end(rules)});
    if (t.child("plant_gain") != nullptr) {
      d.plant_gain = t.number("plant_gain");
      if (*d.plant_gain == 0.0) t.wrong(*t.child("plant_gain"), "plant_gain", "a number other than 0", "range");
    }
    d.large_lag_s = positive(t, "large_lag_s"), d.small_lag_s = positive(t, "small_lag_s");
    d.symmetric_factor = positive(t, "symmetric_factor", 1.0);
    if (d.symmetric_factor && d.rule != "symmetric_optimum")
      refuse(t.child("symmetric_factor")->name_place, "design.symmetric_factor",
             "'design.symmetric_factor' goes with rule = \"symmetric_optimum\"", "relation");
    return d;
  }
  choose(d, t, s);
  read_matrices(d, t, s);
  const Side order{s.order(), "the system's order"};
  if (d.kind == DesignKind::place || t.child("poles") != nullptr) d.poles = read_poles(t, "poles", order);
  if (t.child("controller_poles") != nullptr) d.controller_poles = read_poles(t, "controller_poles", order);
  if (t.child("observer_poles") != nullptr) d.observer_poles = read_poles(t, "observer_poles", order);
  d.faster_than_controller = positive(t, "faster_than_controller");
  if (d.kind == DesignKind::observer && d.poles.empty() && !d.faster_than_controller)
    (void)t.need("poles", "a list of poles, or faster_than_controller = 4.0");
  if (d.kind == DesignKind::observer) not_both(t, "poles", "faster_than_controller");
  not_both(t, "observer_poles", "faster_than_controller");
  not_both(t, "observer_poles", "W"), not_both(t, "faster_than_controller", "W");
  not_both(t, "Q", "controller_poles"), not_both(t, "Q_integral", "N");
  return d;
}

}  // namespace slipbench
