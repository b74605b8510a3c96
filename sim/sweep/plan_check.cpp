// What of a plan its scenario must agree to.
#include <algorithm>

#include "sim/scenario/keys.hpp"
#include "sim/scenario/tree.hpp"
#include "sim/sweep/plan.hpp"

namespace slipbench {

namespace {

bool holds(const std::vector<std::string>& names, const std::string& name) {
  return std::find(names.begin(), names.end(), name) != names.end();
}

// Keys that are varied twice, set beside the plan, or name columns.
void check_keys(const std::vector<std::string>& keys, const std::vector<std::string>& places, const SweepPlan& plan,
                std::vector<std::string>& seen) {
  for (std::size_t i = 0; i < keys.size(); ++i) {
    const std::string& key = keys[i];
    const std::string shown = "'" + printable(key) + "'";
    if (holds(seen, key)) throw InputError(places[i], key, shown + " is varied twice: name it once", "relation");
    seen.push_back(key);
    for (const Override& o : plan.overrides) {
      if (o.key != key) continue;
      throw InputError("--set:" + printable(key), key,
                       shown + " is varied by the plan at " + places[i] +
                           ": change its values there, or with --set plan.vary.0.values=[...] and the like",
                       "relation");
    }
    if (key == "seed" && plan.seed)
      throw InputError("command line", "--seed", "--seed: the plan varies 'seed' at " + places[i], "usage");
    if (row_path(key).path == "estimator[].name")
      throw InputError(places[i], key, shown + " names columns of the results; vary its kind or settings instead",
                       "relation");
  }
}

// Reads the scenario with one group of keys at one value; what is wrong with it is told where the plan says so.
Scenario try_value(const ScenarioFile& file, const SweepPlan& plan, const std::vector<std::string>& keys,
                   const std::vector<std::string>& key_places, const Tried& tried) {
  std::vector<Override> overrides = plan.overrides;
  for (const std::string& key : keys) overrides.push_back({key, tried.value});
  try {
    return file.read(overrides, plan.seed);
  } catch (const InputError& e) {
    const auto at = std::find(keys.begin(), keys.end(), e.key());
    const bool of_key = at != keys.end() && e.place() == "--set:" + printable(e.key());
    if (of_key && e.code() == "unknown_key")
      throw InputError(key_places[static_cast<std::size_t>(at - keys.begin())], e.key(), e.message(), e.code());
    const std::string before = of_key ? "" : "with " + printable(keys.front() + " = " + tried.value) + ": ";
    throw InputError(tried.place, e.key(), before + (of_key ? e.message() : e.what()), e.code());
  }
}

void check_drawn(const ScenarioFile& file, const SweepPlan& plan, const DrawnKey& drawn) {
  for (const Tried& tried : drawn.tried) {
    Scenario scenario = try_value(file, plan, drawn.keys, drawn.key_places, tried);
    for (std::size_t i = 0; i < drawn.keys.size(); ++i) {
      const std::string& key = drawn.keys[i];
      const Key* row = find_key(scenario, key);
      const bool real = row != nullptr && row->numeric() &&
                        (std::holds_alternative<double& (*)(Scenario&, std::size_t)>(row->slot) ||
                         (std::holds_alternative<MethodSetting>(row->slot) &&
                          std::get<MethodSetting>(row->slot).setting->shape == SettingShape::number));
      if (real) continue;
      throw InputError(drawn.key_places[i], key,
                       "'" + printable(key) +
                           "' cannot be drawn: wanted is a key that holds a real number and may differ side by side; "
                           "list its values under [[vary]] in a plan that crosses",
                       "type");
    }
  }
}

}  // namespace

ScenarioFile scenario_of(const SweepPlan& plan) {
  std::vector<std::string> machines;
  const auto add = [&](const std::string& key, const std::string& value) {
    if (key.ends_with(".file")) machines.push_back(value);
  };
  for (const Override& o : plan.overrides) add(o.key, o.value);
  for (const Vary& vary : plan.varies) {
    for (const std::string& key : vary.keys) {
      for (const std::string& value : vary.values) add(key, value);
    }
  }
  return ScenarioFile(plan.scenario, machines);
}

void check_plan(const SweepPlan& plan) {
  std::vector<std::string> seen;
  for (const Vary& vary : plan.varies) check_keys(vary.keys, vary.key_places, plan, seen);
  if (plan.sample) {
    for (const DrawnKey& drawn : plan.sample->keys) check_keys(drawn.keys, drawn.key_places, plan, seen);
  }
  const ScenarioFile file = scenario_of(plan);
  (void)file.read(plan.overrides, plan.seed);
  for (const Vary& vary : plan.varies) {
    for (const Tried& tried : vary.tried) (void)try_value(file, plan, vary.keys, vary.key_places, tried);
  }
  if (!plan.sample) return;
  for (const DrawnKey& drawn : plan.sample->keys) check_drawn(file, plan, drawn);
}

}  // namespace slipbench
