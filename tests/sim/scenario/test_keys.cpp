// The table of keys against itself, and the nearest name.
#include <catch2/catch.hpp>
#include <set>

#include "sim/scenario/keys.hpp"
#include "sim/scenario/nearest.hpp"
#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using namespace scenario_tests;

TEST_CASE("edit distance: textbook pairs", "[scenario][published]") {
  // kitten/sitting 3 and ca/abc 3 (restricted form) are the usual textbook pairs (common practice).
  CHECK(edit_distance("kitten", "sitting") == 3);
  CHECK(edit_distance("ca", "abc") == 3);
  CHECK(edit_distance("", "abc") == 3);
  CHECK(edit_distance("abc", "") == 3);
  CHECK(edit_distance("form", "from") == 1);
  CHECK(edit_distance("same", "same") == 0);
  CHECK(edit_distance(std::string(1000000, 'a'), "a") == 63);  // compared by its first 64 characters
  CHECK(nearest("rk5", {"euler", "midpoint", "rk4"}) == "rk4");
  CHECK(nearest("x", {}).empty());
}

TEST_CASE("keys: each belongs to a known table, has a meaning, and stands once a kind", "[scenario][keys]") {
  std::set<std::pair<std::string, std::string>> seen;
  for (const Key& key : scenario_keys()) {
    INFO(key.path);
    CHECK(find_section(key.section()) != nullptr);
    CHECK_FALSE(key.meaning.empty());
    CHECK_FALSE(key.allowed().empty());
    CHECK(key.range.low <= key.range.high);
    const std::vector<std::string_view> everywhere{""};
    for (const std::string_view kind : key.when.empty() ? everywhere : key.when) {
      CHECK(seen.insert({key.path, std::string(kind)}).second);
      CHECK((kind.empty() || seen.count({key.path, ""}) == 0));
    }
  }
  CHECK(seen.size() > 120);
}

TEST_CASE("keys: a fresh scenario's defaults are allowed values", "[scenario][keys]") {
  Scenario fresh;
  fresh.loads.resize(1), fresh.estimators.resize(1), fresh.drifts.resize(1), fresh.events.resize(1);
  for (const Key& key : scenario_keys()) {
    if (key.need == Need::required || !key.otherwise.empty()) continue;
    INFO(key.path);
    if (const auto* real = std::get_if<double& (*)(Scenario&, std::size_t)>(&key.slot)) {
      CHECK(key.range.holds((*real)(fresh, 0)));
    } else if (const auto* text = std::get_if<std::string& (*)(Scenario&, std::size_t)>(&key.slot)) {
      CHECK((key.words.empty() || std::count(key.words.begin(), key.words.end(), (*text)(fresh, 0)) == 1));
    } else if (const auto* method = std::get_if<MethodSetting>(&key.slot)) {
      CHECK(key.range.holds(method->setting->fallback));
    }
  }
}

TEST_CASE("keys: every misspelt key is given back as the nearest", "[scenario][keys]") {
  // One letter doubled in the middle of each key of the whole example's tables.
  const std::string text = whole_text();
  for (const char* key :
       {"run.method", "machine.pole_pairs", "shaft.inertia_kgm2", "supply.dc_link_V", "sensors.current.noise_A",
        "reference.speed_rpm", "controller.orientation", "estimator.0.name", "belief.inertia", "drift.0.factor",
        "score.lost_for_s", "load.2.rated_speed_rpm", "estimator.1.adaptation_bandwidth_Hz"}) {
    const std::string known = key;
    const std::size_t middle = known.rfind('.') + 2;
    const std::string typed = known.substr(0, middle) + known[middle] + known.substr(middle);
    const InputError error = error_of(text, {{typed, "1"}});
    INFO(error.what());
    CHECK(error.key() == typed);
    CHECK(error.message().find("'" + known + "'") != std::string::npos);
  }
  CHECK(error_of(text, {{"shaft.inertia", "1"}}).message().find("'shaft.inertia_kgm2'") != std::string::npos);
  CHECK(error_of(text, {{"run.dead_time_s", "1"}}).message().find("'supply.dead_time_s'") != std::string::npos);
}

TEST_CASE("keys: what a sweep may vary", "[scenario][keys]") {
  Scenario s = read(whole_text());
  REQUIRE(find_key(s, "belief.rotor_resistance") != nullptr);
  CHECK(find_key(s, "belief.rotor_resistance")->numeric());
  CHECK_FALSE(find_key(s, "run.method")->numeric());
  CHECK_FALSE(find_key(s, "run.plant_step_s")->numeric());
  CHECK_FALSE(find_key(s, "estimator.0.load_torque")->numeric());
  CHECK(find_key(s, "load.0.torque_Nm")->when.front() == "profile");
  CHECK(find_key(s, "load.1.torque_Nm")->when.front() == "constant_torque");
  CHECK(find_key(s, "load.2.torque_Nm") == nullptr);
}
