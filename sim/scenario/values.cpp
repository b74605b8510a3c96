#include "sim/scenario/values.hpp"

#include <cmath>

#include "sim/scenario/fill.hpp"
#include "sim/scenario/nearest.hpp"

namespace slipbench {
namespace {

constexpr std::size_t largest_table = 64;  // elements of an array of numbers or rows

struct Store {
  Scenario& scenario;
  const Key& key;
  std::size_t index;
  const Node& node;
  const std::string& dotted;

  [[noreturn]] void wrong(const Node& at, const std::string& shown, const char* code,
                          const std::string& more = "") const {
    refuse(at.place, shown, "'" + printable(shown) + "' is " + found_text(at) + "; wanted is " + key.allowed() + more,
           code);
  }
  double number(const Node& at, const std::string& shown) const {
    if (!at.is_number()) wrong(at, shown, "type");
    const double x = at.number();
    if (!std::isfinite(x)) wrong(at, shown, "range", "; never NaN or infinity");
    return x;
  }
  double ranged(const Node& at, const std::string& shown) const {
    const double x = number(at, shown);
    if (!key.range.holds(x)) wrong(at, shown, "range");
    return x;
  }

  void operator()(double& (*slot)(Scenario&, std::size_t)) const { slot(scenario, index) = ranged(node, dotted); }

  void operator()(std::int64_t& (*slot)(Scenario&, std::size_t)) const {
    if (node.kind != Node::Kind::whole) wrong(node, dotted, "type");
    ranged(node, dotted);
    slot(scenario, index) = node.whole;
  }

  void operator()(std::uint64_t& (*slot)(Scenario&, std::size_t)) const {
    if (node.kind != Node::Kind::whole) wrong(node, dotted, "type");
    if (node.whole < 0) wrong(node, dotted, "range");
    slot(scenario, index) = static_cast<std::uint64_t>(node.whole);
  }

  void operator()(bool& (*slot)(Scenario&, std::size_t)) const {
    if (node.kind != Node::Kind::truth) wrong(node, dotted, "type");
    slot(scenario, index) = node.truth;
  }

  void operator()(std::string& (*slot)(Scenario&, std::size_t)) const {
    if (node.kind != Node::Kind::text) wrong(node, dotted, "type");
    if (!key.words.empty()) {
      bool known = false;
      for (const std::string_view word : key.words) known = known || word == node.text;
      if (!known) wrong(node, dotted, "range", "; nearest is " + std::string(nearest(node.text, key.words)));
    }
    slot(scenario, index) = node.text;
  }

  void operator()(Knots& (*slot)(Scenario&, std::size_t)) const {
    if (node.kind != Node::Kind::array || node.children.empty()) wrong(node, dotted, "type");
    Knots knots;
    knots.reserve(node.children.size());
    for (std::size_t i = 0; i < node.children.size(); ++i) {
      const Node& knot = node.children[i];
      const std::string shown = dotted + "." + std::to_string(i);
      if (knot.kind != Node::Kind::array || knot.children.size() != 2) wrong(knot, shown, "type");
      knots.push_back({number(knot.children[0], shown + ".0"), ranged(knot.children[1], shown + ".1")});
      const auto at = [&](std::size_t back) { return knots[i - back][0]; };
      if (i >= 1 && at(0) < at(1)) {
        refuse(knot.place, shown,
               "'" + shown + "': the time " + number_text(at(0)) + " s comes after " + number_text(at(1)) +
                   " s; times must not go back (equal times make a step)",
               "relation");
      }
      if (i >= 2 && at(0) == at(2)) {
        refuse(knot.place, shown,
               "'" + shown + "': a third knot at " + number_text(at(0)) + " s; a step takes two, before and after",
               "relation");
      }
    }
    slot(scenario, index) = std::move(knots);
  }

  void operator()(std::array<double, 3>& (*slot)(Scenario&, std::size_t)) const {
    if (node.kind != Node::Kind::array || node.children.size() != 3) wrong(node, dotted, "type");
    std::array<double, 3> values{};
    for (std::size_t i = 0; i < 3; ++i) values[i] = ranged(node.children[i], dotted + "." + std::to_string(i));
    slot(scenario, index) = values;
  }

  // An array of `length` values (0: at least one), each of which `take` reads.
  template <class Take>
  void each(const Node& at, const std::string& shown, std::size_t length, Take take) const {
    const std::size_t size = at.children.size();
    if (at.kind != Node::Kind::array || size == 0 || (length != 0 && size != length))
      wrong(at, shown, "type",
            length == 0 ? "" : "; the first has " + std::to_string(length) + " here, and so have all");
    if (size > largest_table)
      wrong(at, shown, "range", "; more than " + std::to_string(largest_table) + " are not taken");
    for (std::size_t i = 0; i < size; ++i) take(at.children[i], shown + "." + std::to_string(i));
  }

  [[nodiscard]] SettingTable table(bool matrices) const {
    SettingTable t;
    t.count = node.children.size();
    const auto number_into = [&](const Node& at, const std::string& shown) { t.numbers.push_back(ranged(at, shown)); };
    each(node, dotted, 0, [&](const Node& at, const std::string& shown) {
      if (!matrices) return number_into(at, shown);
      each(at, shown, t.rows, [&](const Node& row, const std::string& row_shown) {
        each(row, row_shown, t.columns, number_into);
        t.columns = row.children.size();
      });
      t.rows = at.children.size();
    });
    if (!matrices) t.rows = t.columns = 1;
    return t;
  }

  void operator()(const MethodSetting& method) const {
    const Setting& s = *method.setting;
    if (s.shape != SettingShape::number) {
      method.of(scenario, index).set(std::string(s.name), table(s.shape == SettingShape::matrices));
      return;
    }
    double value = 0.0;
    if (node.kind == Node::Kind::truth && s.structural && s.low == 0.0 && s.high == 1.0) {
      value = node.truth ? 1.0 : 0.0;
    } else {
      value = ranged(node, dotted);
      if (s.structural && value != std::floor(value)) wrong(node, dotted, "range", ", and whole");
    }
    method.of(scenario, index).set(std::string(s.name), value);
  }
};

}  // namespace

void store(Scenario& scenario, const Key& key, std::size_t index, const Node& node, const std::string& dotted) {
  std::visit(Store{scenario, key, index, node, dotted}, key.slot);
}

}  // namespace slipbench
