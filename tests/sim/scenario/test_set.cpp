// --set: applied before anything is checked, placed as --set:key.
#include <catch2/catch.hpp>

#include "sim/scenario/keys.hpp"
#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using namespace scenario_tests;

TEST_CASE("--set: replaces, creates, appends", "[scenario][set]") {
  const std::string text = whole_text();
  CHECK(read(text, {{"run.duration_s", "3"}}).run.duration_s == 3.0);
  CHECK(read(text, {{"run.duration_s", "3"}, {"run.duration_s", "4.0"}}).run.duration_s == 4.0);
  CHECK(read(text, {{"title", "two words"}}).title == "two words");
  CHECK(read(text, {{"title", "\"quoted\""}}).title == "quoted");
  CHECK(read(text, {{"run.method", "euler"}}).run.method == "euler");
  CHECK(read(text,
             {{"estimator.1.kind", "reduced_order"}, {"estimator.1", "{name = \"fast_1\", kind = \"reduced_order\"}"}})
            .estimators[1]
            .kind == "reduced_order");
  CHECK(read(text, {{"belief.stator_resistance", "1.1"}}).belief.stator_resistance == 1.1);
  CHECK(read(text, {{"load.0.torque_Nm.2.1", "9"}}).loads[0].torque_profile[2][1] == 9.0);
  CHECK(read(text, {{"load.0.torque_Nm.3", "[1.0, 4]"}}).loads[0].torque_profile.size() == 4);
  CHECK(read(text, {{"load.0.torque_Nm", "[[0, 1]]"}}).loads[0].torque_profile == Knots{{0.0, 1.0}});
  CHECK(read(text, {{"sensors.current.offset_A.0", "0.5"}}).sensors.current.offset[0] == 0.5);
  CHECK(read(text, {{"controller.dead_time_compensation", "true"}}).controller.dead_time_compensation);
  const Scenario more = read(text, {{"estimator.2.name", "third"}, {"estimator.2.kind", "reduced_order"}});
  REQUIRE(more.estimators.size() == 3);
  CHECK(more.estimators[2].name == "third");
  const Scenario fresh =
      read(mains_text(), {{"load.0.kind", "fan"}, {"load.0.rated_torque_Nm", "3"}, {"load.0.rated_speed_rpm", "1400"}});
  REQUIRE(fresh.loads.size() == 1);
  CHECK(fresh.loads[0].rated_torque_Nm == 3.0);
  CHECK(read(mains_text(), {{"sensors.voltage.noise_V", "0.5"}}).sensors.voltage.present);
}

TEST_CASE("--set: relations are checked once, with all of it in place", "[scenario][set]") {
  // Neither half alone is a whole multiple.
  CHECK(read(whole_text(), {{"run.plant_step_s", "7e-6"},
                            {"run.control_period_s", "105e-6"},
                            {"run.trace_period_s", "1.05e-3"},
                            {"run.duration_s", "2.1"},
                            {"supply.switching_frequency_Hz", "9523.809523809523"},
                            {"sensors.speed.window_s", "2.1e-3"}})
            .run.plant_step_s == 7e-6);
  CHECK(error_of(whole_text(), {{"run.plant_step_s", "7e-6"}}).key() == "run.control_period_s");
}

TEST_CASE("--set: errors are placed at the option", "[scenario][set][broken]") {
  struct Case {
    const char *key, *value, *wrong_key, *says;
  };
  const Case cases[] = {
      {"run.duraton_s", "1", "run.duraton_s", "run.duration_s"},
      {"rnu.duration_s", "1", "rnu", "'run'"},
      {"run.duration_s", "-1", "run.duration_s", "above 0"},
      {"run.duration_s", "nan", "run.duration_s", "never NaN"},
      {"run.duration_s", "soon", "run.duration_s", "\"soon\" (a string)"},
      {"run.duration_s", "", "run.duration_s", "\"\" (a string)"},
      {"run.duration_s", "1\n[machine]\npole_pairs = 3", "run.duration_s", "(a string)"},
      {"run.duration_s.x", "1", "run.duration_s.x", "holds no key"},
      {"estimator.7.kind", "luenberger", "estimator.7.kind", "list of 2"},
      {"estimator.x.kind", "luenberger", "estimator.x.kind", "list of 2"},
      {"estimator.-1.kind", "luenberger", "estimator.-1.kind", "list of 2"},
      {"estimator.18446744073709551616.kind", "luenberger", "estimator.18446744073709551616.kind", "list of 2"},
      {"estimator.2.kind", "luenberger", "estimator.2.name", "missing"},
      {"estimator.0.kind", "lunberger", "estimator.0.kind", "nearest is luenberger"},
      {"estimator", "ekf", "estimator", "[[estimator]]"},
      {"run", "5", "run", "a table"},
      {"", "1", "", "dotted key"},
      {".", "1", ".", "dotted key"},
      {"run..method", "1", "run..method", "dotted key"},
      {"run.", "1", "run.", "dotted key"},
      {"machine.file", "none.toml", "machine.file", "no such file"},
      {"machine.file", "", "machine.file", "no such file"},
      {"reference.speed_rpm", "[[0, 1], [1, 2], [0.5, 3]]", "reference.speed_rpm.2", "go back"},
      {"score.to_s", "5", "score.to_s", "part of the run"},
      {"supply.model", "switched", "supply.model", "averaged"},
      {"seed", "-1", "seed", "at least 0"},
      {"seed", "1.5", "seed", "whole number"},
      {"title", "3", "title", "a string"},
  };
  for (const Case& c : cases) {
    INFO(c.key << " = " << c.value);
    const InputError error = error_of(whole_text(), {{c.key, c.value}});
    CHECK(error.place() == "--set:" + std::string(c.key));
    CHECK(error.key() == c.wrong_key);
    INFO(error.what());
    CHECK(error.message().find(c.says) != std::string::npos);
  }
  std::string deep = "a";
  for (int i = 0; i < 100000; ++i) deep += ".a";
  CHECK(error_of(whole_text(), {{deep, "1"}}).code() == "unknown_key");
  CHECK(error_of(whole_text(), {{"title", std::string(100000, '[')}}).code() == "none");  // no TOML: a string
}

TEST_CASE("set_number: one number of a scenario that has been read", "[scenario][set]") {
  Scenario s = read(whole_text());
  CHECK(set_number(s, "belief.rotor_resistance", 0.7));
  CHECK(s.belief.rotor_resistance == 0.7);
  CHECK(set_number(s, "load.1.torque_Nm", 3.0));
  CHECK(s.loads[1].torque_Nm == 3.0);
  CHECK(set_number(s, "estimator.1.adaptation_bandwidth_Hz", 33.0));
  CHECK(s.estimators[1].settings.value("adaptation_bandwidth_Hz", 0.0) == 33.0);
  CHECK_FALSE(set_number(s, "load.0.torque_Nm", 3.0));                     // knots
  CHECK_FALSE(set_number(s, "load.9.torque_Nm", 3.0));                     // no such load
  CHECK_FALSE(set_number(s, "estimator.0.adaptation_bandwidth_Hz", 3.0));  // of another kind
  CHECK_FALSE(set_number(s, "run.method", 3.0));
  CHECK_FALSE(set_number(s, "run.plant_step_s", 1e-5));  // structural
  CHECK_FALSE(set_number(s, "nothing", 3.0));
  CHECK_THROWS_AS(set_number(s, "belief.rotor_resistance", -1.0), InputError);
  CHECK_THROWS_AS(set_number(s, "belief.rotor_resistance", std::nan("")), InputError);
}
