#include "sim/sweep/plan.hpp"

#include <cmath>
#include <filesystem>

#include "sim/scenario/keys.hpp"
#include "sim/scenario/nearest.hpp"
#include "sim/scenario/overrides.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

namespace {

[[noreturn]] void refuse(const Place& place, const std::string& key, const std::string& message, const char* code) {
  throw InputError(place.text(), key, message, code);
}

// One table of the plan: what was asked for is taken, what was not is refused.
class Table {
 public:
  Table(const Node& node, std::string shown, std::vector<std::string_view> known)
      : node_(node), shown_(std::move(shown)), known_(std::move(known)) {
    if (node.kind != Node::Kind::table)
      refuse(node.place, shown_, "'" + shown_ + "' is " + found_text(node) + "; wanted is a table", "type");
    for (const Node& child : node.children) {
      bool found = false;
      for (const std::string_view name : known_) found = found || name == child.name;
      if (!found) {
        refuse(child.name_place, dotted(child.name),
               "unknown key '" + printable(dotted(child.name)) + "'; the nearest known key is '" +
                   dotted(nearest(child.name, known_)) + "'",
               "unknown_key");
      }
    }
  }

  [[nodiscard]] const Node* child(std::string_view name) const { return node_.child(name); }
  [[nodiscard]] std::string dotted(std::string_view name) const {
    return shown_.empty() ? std::string(name) : shown_ + "." + std::string(name);
  }
  [[noreturn]] void wrong(const Node& at, std::string_view name, const std::string& wanted) const {
    refuse(at.place, dotted(name), "'" + dotted(name) + "' is " + found_text(at) + "; wanted is " + wanted, "type");
  }
  const Node& need(std::string_view name, const std::string& wanted) const {
    if (const Node* found = child(name)) return *found;
    refuse(node_.place, dotted(name), "missing key '" + dotted(name) + "'; wanted is " + wanted, "missing");
  }
  double number(std::string_view name) const {
    const Node& at = need(name, "a number");
    if (!at.is_number() || !std::isfinite(at.number())) wrong(at, name, "a finite number");
    return at.number();
  }
  std::uint64_t whole(std::string_view name, std::uint64_t low, std::uint64_t high) const {
    const std::string wanted = "a whole number from " + std::to_string(low) + " to " + std::to_string(high);
    const Node& at = need(name, wanted);
    if (at.kind != Node::Kind::whole || at.whole < 0 || static_cast<std::uint64_t>(at.whole) < low ||
        static_cast<std::uint64_t>(at.whole) > high) {
      wrong(at, name, wanted);
    }
    return static_cast<std::uint64_t>(at.whole);
  }
  std::string word(std::string_view name, const std::vector<std::string_view>& words) const {
    std::string list;
    for (const std::string_view w : words) list += (list.empty() ? "one of " : ", ") + std::string(w);
    const Node& at = need(name, words.empty() ? "a string" : list);
    if (at.kind != Node::Kind::text) wrong(at, name, words.empty() ? "a string" : list);
    bool known = words.empty();
    for (const std::string_view w : words) known = known || w == at.text;
    if (!known) wrong(at, name, list + "; nearest is " + std::string(nearest(at.text, words)));
    return at.text;
  }
  // `key = "..."` or `keys = ["...", ...]`.
  [[nodiscard]] std::vector<std::string> keys() const {
    const Node *one = child("key"), *many = child("keys");
    if ((one == nullptr) == (many == nullptr)) {
      refuse(node_.place, dotted("key"), "'" + shown_ + "' needs either key = \"...\" or keys = [...]", "missing");
    }
    if (one != nullptr) return {word("key", {})};
    if (many->kind != Node::Kind::array || many->children.empty()) wrong(*many, "keys", "a list of strings");
    std::vector<std::string> all;
    for (const Node& key : many->children) {
      if (key.kind != Node::Kind::text) wrong(key, "keys", "a list of strings");
      all.push_back(key.text);
    }
    return all;
  }
  [[nodiscard]] const Node& node() const { return node_; }

 private:
  const Node& node_;
  std::string shown_;
  std::vector<std::string_view> known_;
};

// A value as the text of a TOML value, to be set by an override.
std::string value_text(const Node& value, const Table& table) {
  switch (value.kind) {
    case Node::Kind::whole:
      return std::to_string(value.whole);
    case Node::Kind::real:
      if (std::isfinite(value.real)) return number_text(value.real);
      break;
    case Node::Kind::truth:
      return value.truth ? "true" : "false";
    case Node::Kind::text:
      return value.text;
    default:
      break;
  }
  table.wrong(value, "values", "a list of numbers, strings or truths");
}

Vary vary_of(const Table& t) {
  Vary vary;
  vary.keys = t.keys();
  vary.place = t.node().place.text();
  if (const Node* values = t.child("values")) {
    for (const char* other : {"from", "to", "count"}) {
      if (const Node* node = t.child(other))
        refuse(node->name_place, t.dotted(other), "'" + t.dotted(other) + "' does not go with values", "relation");
    }
    if (values->kind != Node::Kind::array || values->children.empty())
      t.wrong(*values, "values", "a list that is not empty");
    for (const Node& value : values->children) vary.values.push_back(value_text(value, t));
    return vary;
  }
  const double from = t.number("from"), to = t.number("to");
  const std::uint64_t count = t.whole("count", 1, 1'000'000);
  for (std::uint64_t i = 0; i < count; ++i) {
    // The ends are met exactly.
    const double x = i == 0           ? from
                     : i + 1 == count ? to
                                      : from + (to - from) * static_cast<double>(i) / static_cast<double>(count - 1);
    vary.values.push_back(number_text(x));
  }
  return vary;
}

DrawnKey drawn_of(const Table& t) {
  DrawnKey key;
  key.keys = t.keys();
  key.place = t.node().place.text();
  const auto none = [&](const char* name, const char* distribution) {
    if (const Node* node = t.child(name))
      refuse(node->name_place, t.dotted(name),
             "'" + t.dotted(name) + "' does not go with distribution = \"" + distribution + "\"", "relation");
  };
  if (t.word("distribution", {"uniform", "normal"}) == "uniform") {
    none("mean", "uniform"), none("sigma", "uniform");
    key.low = t.number("low"), key.high = t.number("high");
    if (!(key.low < key.high)) t.wrong(*t.child("high"), "high", "a number above low, " + number_text(key.low));
  } else {
    none("low", "normal"), none("high", "normal");
    key.distribution = DrawnKey::Distribution::normal;
    key.mean = t.number("mean"), key.sigma = t.number("sigma");
    if (!(key.sigma > 0.0)) t.wrong(*t.child("sigma"), "sigma", "a number above 0");
  }
  return key;
}

Sampling sample_of(const Node& node, std::uint64_t scenario_seed) {
  const Table t(node, "sample", {"kind", "count", "seed", "key"});
  Sampling sample;
  const std::string kind = t.word("kind", {"random", "latin_hypercube", "sobol", "saltelli"});
  sample.kind = kind == "random"            ? DrawKind::random
                : kind == "latin_hypercube" ? DrawKind::latin_hypercube
                : kind == "sobol"           ? DrawKind::sobol
                                            : DrawKind::saltelli;
  sample.count = t.whole("count", 1, most_cases / (most_drawn_keys + 2));
  sample.seed = t.child("seed") != nullptr ? t.whole("seed", 0, 9223372036854775807u) : scenario_seed;
  const Node& keys = t.need("key", "a list of tables, [[sample.key]]");
  if (keys.kind != Node::Kind::array || keys.children.empty()) t.wrong(keys, "key", "a list of tables, [[sample.key]]");
  if (keys.children.size() > most_drawn_keys)
    t.wrong(keys, "key", "at most " + std::to_string(most_drawn_keys) + " tables");
  for (std::size_t i = 0; i < keys.children.size(); ++i) {
    const Table key(keys.children[i], "sample.key." + std::to_string(i),
                    {"key", "keys", "distribution", "low", "high", "mean", "sigma"});
    sample.keys.push_back(drawn_of(key));
  }
  return sample;
}

// Reads the scenario with one group of keys at one value; what is wrong with it is told at the plan's own line.
void try_value(const ScenarioFile& file, const SweepPlan& plan, const std::vector<std::string>& keys,
               const std::string& value, const std::string& place) {
  std::vector<Override> overrides = plan.overrides;
  for (const std::string& key : keys) overrides.push_back({key, value});
  try {
    (void)file.read(overrides, plan.seed);
  } catch (const InputError& e) {
    if (!e.place().starts_with("--set:")) throw;
    throw InputError(place, e.key(), e.message(), e.code());
  }
}

void check_values(const SweepPlan& plan) {
  const ScenarioFile file(plan.scenario);
  for (const Vary& vary : plan.varies) {
    for (const std::string& value : vary.values) try_value(file, plan, vary.keys, value, vary.place);
  }
  if (!plan.sample) return;
  Scenario scenario = file.read(plan.overrides, plan.seed);
  for (const DrawnKey& drawn : plan.sample->keys) {
    for (const std::string& key : drawn.keys) {
      const Key* row = find_key(scenario, key);
      if (row == nullptr) {
        try_value(file, plan, {key}, "1", drawn.place);  // says what is wrong with it
        row = find_key(scenario, key);
      }
      if (row != nullptr && !row->numeric()) {
        throw InputError(drawn.place, key,
                         "'" + key + "' is no key that can be drawn; wanted is one that holds a real number", "type");
      }
    }
    const bool uniform = drawn.distribution == DrawnKey::Distribution::uniform;
    const double low = uniform ? drawn.low : drawn.mean, high = uniform ? drawn.high : drawn.mean;
    try_value(file, plan, drawn.keys, number_text(low), drawn.place);
    if (uniform) try_value(file, plan, drawn.keys, number_text(high), drawn.place);
  }
}

}  // namespace

SweepPlan read_plan(const std::string& path, const std::vector<Override>& overrides,
                    std::optional<std::uint64_t> seed) {
  SweepPlan plan;
  plan.path = path;
  plan.seed = seed;
  std::string why;
  const auto text = read_text(path, why);
  if (!text) throw InputError(path, "", why, "file");
  plan.text = *text;
  Node root = parse_toml(*text, path);
  std::vector<Override> of_plan;
  for (const Override& o : overrides) {
    if (o.key.starts_with("plan."))
      of_plan.push_back({o.key.substr(5), o.value});
    else
      plan.overrides.push_back(o);
  }
  apply_overrides(root, of_plan);

  const Table t(root, "", {"format", "title", "scenario", "runs", "vary", "sample"});
  if (t.child("format") != nullptr) (void)t.whole("format", 1, 1);
  if (t.child("title") != nullptr) plan.title = t.word("title", {});
  const std::string scenario = t.word("scenario", {});
  plan.scenario = (std::filesystem::path(path).parent_path() / scenario).lexically_normal().string();
  if (t.child("runs") != nullptr) plan.runs = static_cast<std::uint32_t>(t.whole("runs", 1, 1'000'000));
  if (const Node* varies = t.child("vary")) {
    if (varies->kind != Node::Kind::array) t.wrong(*varies, "vary", "a list of tables, [[vary]]");
    for (std::size_t i = 0; i < varies->children.size(); ++i) {
      const Table one(varies->children[i], "vary." + std::to_string(i),
                      {"key", "keys", "values", "from", "to", "count"});
      plan.varies.push_back(vary_of(one));
    }
  }
  if (const Node* sample = t.child("sample")) {
    if (!plan.varies.empty())
      refuse(sample->name_place, "sample", "'sample' does not go with [[vary]]: a plan either crosses values or draws",
             "relation");
    if (!std::filesystem::exists(plan.scenario))
      t.wrong(*t.child("scenario"), "scenario", "a file that is there: no '" + plan.scenario + "'");
    plan.sample = sample_of(*sample, ScenarioFile(plan.scenario).read(plan.overrides, seed).seed);
  }
  if (!std::filesystem::exists(plan.scenario))
    t.wrong(*t.child("scenario"), "scenario", "a file that is there: no '" + plan.scenario + "'");
  std::vector<std::string> seen;
  for (const std::string& key : plan.keys()) {
    for (const std::string& other : seen) {
      if (key == other) refuse({root.place.file, 1, 1}, key, "'" + key + "' is varied twice", "relation");
    }
    seen.push_back(key);
  }
  double count = 1.0;
  for (const Vary& vary : plan.varies) count *= static_cast<double>(vary.values.size());
  if (count > static_cast<double>(most_cases))
    refuse({root.place.file, 1, 1}, "vary", "the plan has more than " + std::to_string(most_cases) + " cases", "range");
  check_values(plan);
  return plan;
}

}  // namespace slipbench
