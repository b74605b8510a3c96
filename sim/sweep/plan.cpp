#include "sim/sweep/plan.hpp"

#include <cmath>
#include <filesystem>

#include "sim/scenario/fill.hpp"
#include "sim/scenario/overrides.hpp"
#include "sim/scenario/table_reader.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

namespace {

// `key = "..."` or `keys = ["...", ...]`.
void keys_of(const TableReader& t, std::vector<std::string>& names, std::vector<std::string>& places) {
  const Node *one = t.child("key"), *many = t.child("keys");
  if ((one == nullptr) == (many == nullptr)) {
    refuse(t.node().place, t.dotted("key"), "'" + t.shown() + "' needs either key = \"...\" or keys = [...]",
           "missing");
  }
  if (one != nullptr) {
    names = {t.word("key", {})}, places = {one->place.text()};
    return;
  }
  if (many->kind != Node::Kind::array || many->children.empty())
    t.wrong(*many, "keys", "a list of strings, at least one");
  for (const Node& key : many->children) {
    if (key.kind != Node::Kind::text) t.wrong(key, "keys", "a list of strings");
    names.push_back(key.text), places.push_back(key.place.text());
  }
}

// A string as an override must give it so that it comes out the same: bare where that does, else quoted as TOML.
std::string string_text(const std::string& text) {
  const Node bare = parse_value(text, {});
  if (bare.kind == Node::Kind::text && bare.text == text) return text;
  std::string quoted = "\"";
  for (const char c : text) {
    constexpr char hex[] = "0123456789ABCDEF";
    const auto byte = static_cast<unsigned char>(c);
    if (byte < 0x20 || byte == 0x7f)
      quoted += std::string("\\u00") + hex[byte >> 4] + hex[byte & 15];
    else
      quoted += (c == '"' || c == '\\' ? std::string("\\") : std::string()) + c;
  }
  return quoted + "\"";
}

// A value as the text of a TOML value, to be set by an override.
std::string value_text(const Node& value, const TableReader& table) {
  switch (value.kind) {
    case Node::Kind::whole:
      return std::to_string(value.whole);
    case Node::Kind::real:
      if (std::isfinite(value.real)) return number_text(value.real);
      break;
    case Node::Kind::truth:
      return value.truth ? "true" : "false";
    case Node::Kind::text:
      return string_text(value.text);
    default:
      break;
  }
  table.wrong(value, "values", "a list of numbers, strings or truths");
}

Vary vary_of(const TableReader& t) {
  Vary vary;
  keys_of(t, vary.keys, vary.key_places);
  if (const Node* values = t.child("values")) {
    for (const char* other : {"from", "to", "count"}) {
      if (const Node* node = t.child(other))
        refuse(node->name_place, t.dotted(other), "'" + t.dotted(other) + "' does not go with values", "relation");
    }
    if (values->kind != Node::Kind::array || values->children.empty())
      t.wrong(*values, "values", "a list that is not empty");
    for (const Node& value : values->children) {
      vary.values.push_back(value_text(value, t));
      vary.tried.push_back({vary.values.back(), value.place.text()});
    }
    return vary;
  }
  if (t.child("from") == nullptr) (void)t.need("values", "a list, or from, to and count");
  const double from = t.number("from"), to = t.number("to");
  if (from == to) t.wrong(*t.child("to"), "to", "another number than from; one value alone is values = [...]");
  const std::uint64_t count = t.whole("count", 2, 1'000'000);
  for (std::uint64_t i = 0; i < count; ++i) {
    // The ends are met exactly.
    const double x = i == 0           ? from
                     : i + 1 == count ? to
                                      : from + (to - from) * static_cast<double>(i) / static_cast<double>(count - 1);
    vary.values.push_back(number_text(x));
  }
  vary.tried = {{vary.values.front(), t.child("from")->place.text()},
                {vary.values[count / 2], t.child("count")->place.text()},
                {vary.values.back(), t.child("to")->place.text()}};
  return vary;
}

DrawnKey drawn_of(const TableReader& t) {
  DrawnKey key;
  keys_of(t, key.keys, key.key_places);
  const auto none = [&](const char* name, const char* distribution) {
    if (const Node* node = t.child(name))
      refuse(node->name_place, t.dotted(name),
             "'" + t.dotted(name) + "' does not go with distribution = \"" + distribution + "\"", "relation");
  };
  if (t.word("distribution", {"uniform", "normal"}) == "uniform") {
    none("mean", "uniform"), none("sigma", "uniform");
    key.low = t.number("low"), key.high = t.number("high");
    if (!(key.low < key.high)) t.wrong(*t.child("high"), "high", "a number above low, " + number_text(key.low));
    key.tried = {{number_text(key.low), t.child("low")->place.text()},
                 {number_text(key.high), t.child("high")->place.text()}};
  } else {
    none("low", "normal"), none("high", "normal");
    key.distribution = DrawnKey::Distribution::normal;
    key.mean = t.number("mean"), key.sigma = t.number("sigma");
    if (!(key.sigma > 0.0)) t.wrong(*t.child("sigma"), "sigma", "a number above 0");
    key.tried = {{number_text(key.mean), t.child("mean")->place.text()}};
  }
  return key;
}

Sampling sample_of(const Node& node, std::uint64_t scenario_seed) {
  const TableReader t(node, "sample", {"kind", "count", "seed", "key"});
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
    const TableReader key(keys.children[i], "sample.key." + std::to_string(i),
                          {"key", "keys", "distribution", "low", "high", "mean", "sigma"});
    sample.keys.push_back(drawn_of(key));
  }
  return sample;
}

// The scenario's path, once a scenario lies there.
std::string scenario_path(const std::string& plan, const TableReader& t) {
  const std::string name = t.word("scenario", {});
  const std::string path = (std::filesystem::path(plan).parent_path() / name).lexically_normal().string();
  const Node& at = *t.child("scenario");
  std::string why = "the name is empty";
  if (name.empty() || !read_text(path, why))
    refuse(at.place, "scenario", "'scenario' names \"" + printable(path) + "\": " + why, "file");
  try {
    (void)ScenarioFile(path);
  } catch (const InputError& e) {
    if (e.code() != "file") throw;
    refuse(at.place, "scenario", "'scenario' names \"" + printable(path) + "\": " + e.message(), "file");
  }
  return path;
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
  for (const Override& o : overrides) {
    if (o.key.starts_with("plan."))
      plan.of_plan.push_back({o.key.substr(5), o.value});
    else
      plan.overrides.push_back(o);
  }
  apply_overrides(root, plan.of_plan, "plan.");

  const TableReader t(root, "", {"format", "title", "scenario", "runs", "vary", "sample"});
  if (t.child("format") != nullptr) (void)t.whole("format", 1, 1);
  if (t.child("title") != nullptr) plan.title = t.word("title", {});
  plan.scenario = scenario_path(path, t);
  if (t.child("runs") != nullptr) plan.runs = static_cast<std::uint32_t>(t.whole("runs", 1, 1'000'000));
  if (const Node* varies = t.child("vary")) {
    if (varies->kind != Node::Kind::array || varies->children.empty())
      t.wrong(*varies, "vary", "a list of tables, [[vary]]");
    for (std::size_t i = 0; i < varies->children.size(); ++i) {
      const TableReader one(varies->children[i], "vary." + std::to_string(i),
                            {"key", "keys", "values", "from", "to", "count"});
      plan.varies.push_back(vary_of(one));
    }
  }
  if (const Node* sample = t.child("sample")) {
    if (!plan.varies.empty())
      refuse(sample->name_place, "sample", "'sample' does not go with [[vary]]: a plan either crosses values or draws",
             "relation");
    plan.sample = sample_of(*sample, ScenarioFile(plan.scenario).read(plan.overrides, seed).seed);
  }
  double count = 1.0;
  for (const Vary& vary : plan.varies) count *= static_cast<double>(vary.values.size());
  if (count > static_cast<double>(most_cases))
    refuse(t.child("vary")->children.back().place, "vary",
           "the plan has " + short_text(count) + " cases; allowed are at most " + std::to_string(most_cases) +
               ": fewer values, or draws ([sample])",
           "range");
  check_plan(plan);
  return plan;
}

}  // namespace slipbench
