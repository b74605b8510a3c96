// slipbench run: the shape of its JSON, its figures recomputed from its trace, its digests.
#include <catch2/catch.hpp>
#include <cmath>
#include <map>
#include <set>

#include "sim/record/digest.hpp"
#include "tests/tools/command.hpp"

using namespace slipbench;
using namespace slipbench::test;

namespace {

constexpr double pi = 3.14159265358979323846;

std::set<std::string> keys(const nlohmann::json& object) {
  std::set<std::string> all;
  for (const auto& item : object.items()) all.insert(item.key());
  return all;
}

using Columns = std::map<std::string, std::vector<double>>;

Columns read_trace(const std::string& path) {
  std::istringstream lines(content(path));
  std::string line, cell;
  std::getline(lines, line);
  std::vector<std::string> names;
  for (std::istringstream cells(line); std::getline(cells, cell, ',');) names.push_back(cell);
  Columns columns;
  while (std::getline(lines, line)) {
    std::size_t i = 0;
    for (std::istringstream cells(line); std::getline(cells, cell, ',');)
      columns[names.at(i++)].push_back(std::stod(cell));
    if (i != names.size()) throw std::runtime_error("a row of another length");
  }
  return columns;
}

struct Moments {
  double rmse = 0, bias = 0, largest = 0;
};
Moments over_window(const Columns& c, const std::function<double(std::size_t)>& error) {
  Moments m;
  double n = 0;
  for (std::size_t i = 0; i < c.at("time_s").size(); ++i) {
    if (c.at("time_s")[i] < 0.05 - 1e-9) continue;
    const double e = error(i);
    n += 1, m.rmse += e * e, m.bias += e, m.largest = std::max(m.largest, std::fabs(e));
  }
  return {std::sqrt(m.rmse / n), m.bias / n, m.largest};
}

}  // namespace

TEST_CASE("run: JSON has the contract's shape", "[tools][contract]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const Answer answer = folder.run({"run", file, "--json"});
  INFO(answer.err);
  REQUIRE(answer.status == 0);
  const auto j = answer.json();
  for (const char* key : {"slipbench", "scenario", "seed", "status", "simulated_s", "wall_s", "final", "mean", "drive",
                          "estimators", "digest"}) {
    CHECK(j.contains(key));
  }
  CHECK(j["scenario"] == "Short test drive, data invented");
  CHECK(j["seed"] == 5);
  CHECK(j["status"] == "done");
  CHECK(j["simulated_s"].get<double>() == Approx(0.3));
  CHECK(keys(j["estimators"]) == std::set<std::string>{"ekf", "obs"});
  CHECK(keys(j["estimators"]["obs"]) ==
        std::set<std::string>{"kind", "speed_rmse_rpm", "speed_bias_rpm", "speed_max_error_rpm", "flux_rmse_Wb",
                              "angle_rmse_deg", "torque_rmse_Nm", "lost_at_s", "settled_at_s", "step_ns"});
  CHECK(j["estimators"]["obs"]["lost_at_s"].is_null());
  CHECK(j["estimators"]["obs"]["step_ns"].get<double>() > 0.0);
  CHECK(keys(j["drive"]) == std::set<std::string>{"speed_tracking_rmse_rpm", "load_dip_rpm", "recovery_s",
                                                  "peak_current_A", "torque_ripple_Nm", "copper_loss_W",
                                                  "voltage_clipped_fraction"});
  CHECK(keys(j["digest"]) == std::set<std::string>{"plant", "obs", "ekf"});
  CHECK(j["digest"]["plant"].get<std::string>().size() == 64);
  CHECK(keys(j["final"]) == keys(j["mean"]));
  for (const char* column :
       {"time_s", "speed_rpm", "rotor_resistance_ohm", "measured.i_a_A", "obs.speed_rpm", "ekf.trust"}) {
    CHECK(j["final"].contains(column));
  }
  CHECK(j["final"]["time_s"].get<double>() == Approx(0.3).epsilon(1e-12));
  CHECK(answer.err.empty());
}

TEST_CASE("run: the figures are those of the trace", "[tools][closed_form]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const Answer answer = folder.run({"run", file, "--json", "--trace", folder.file("t.csv")});
  REQUIRE(answer.status == 0);
  const auto j = answer.json();
  const Columns c = read_trace(folder.file("t.csv"));
  REQUIRE(c.at("time_s").size() == 3001);  // 0.3 s at 100 us, both ends
  // One trace row a tick, every number read back to the bit: only the order of sums differs. 2500 terms of 1.1e-16 each,
  // and the estimates' change of unit.
  const double sums = 1e-11;
  for (const std::string name : {"obs", "ekf"}) {
    const auto error = [&](const char* column) {
      return over_window(c, [&](std::size_t i) { return c.at(name + "." + column)[i] - c.at(column)[i]; });
    };
    const auto& figures = j["estimators"][name];
    CHECK(figures["speed_rmse_rpm"].get<double>() == Approx(error("speed_rpm").rmse).epsilon(sums).margin(500 * sums));
    CHECK(figures["speed_bias_rpm"].get<double>() == Approx(error("speed_rpm").bias).epsilon(sums).margin(500 * sums));
    CHECK(figures["speed_max_error_rpm"].get<double>() ==
          Approx(error("speed_rpm").largest).epsilon(sums).margin(500 * sums));
    CHECK(figures["flux_rmse_Wb"].get<double>() == Approx(error("rotor_flux_Wb").rmse).epsilon(sums));
    CHECK(figures["torque_rmse_Nm"].get<double>() == Approx(error("torque_Nm").rmse).epsilon(sums));
    const Moments angle = over_window(c, [&](std::size_t i) {
      const double e = c.at(name + ".rotor_flux_angle_rad")[i] - c.at("rotor_flux_angle_rad")[i];
      return std::atan2(std::sin(e), std::cos(e)) * 180.0 / pi;
    });
    CHECK(figures["angle_rmse_deg"].get<double>() ==
          Approx(angle.rmse).epsilon(1e-9));  // sin of an angle near pi loses digits
  }
  const Moments tracking =
      over_window(c, [&](std::size_t i) { return c.at("speed_rpm")[i] - c.at("speed_reference_rpm")[i]; });
  CHECK(j["drive"]["speed_tracking_rmse_rpm"].get<double>() == Approx(tracking.rmse).epsilon(sums));
  const Moments current =
      over_window(c, [&](std::size_t i) { return std::hypot(c.at("i_alpha_A")[i], c.at("i_beta_A")[i]); });
  CHECK(j["drive"]["peak_current_A"].get<double>() == Approx(current.largest).epsilon(sums));
  const Moments torque = over_window(c, [&](std::size_t i) { return c.at("torque_Nm")[i]; });
  CHECK(j["drive"]["torque_ripple_Nm"].get<double>() ==
        Approx(std::sqrt(torque.rmse * torque.rmse - torque.bias * torque.bias))
            .epsilon(1e-9));  // a difference of squares
  CHECK(j["mean"]["torque_Nm"].get<double>() == Approx(torque.bias).epsilon(sums));
  CHECK(j["drive"]["load_dip_rpm"].get<double>() > 0.0);
  CHECK(j["final"]["ekf.speed_rpm"].get<double>() == c.at("ekf.speed_rpm").back());
}

TEST_CASE("run: the digests are those of the trace's columns", "[tools][contract]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const Answer answer = folder.run({"run", file, "--json", "--trace", folder.file("t.csv")});
  REQUIRE(answer.status == 0);
  const Columns c = read_trace(folder.file("t.csv"));
  const auto digest_of = [&](const std::vector<Column>& columns) {
    Sha256 sha;
    for (std::size_t row = 0; row < c.at("time_s").size(); ++row) {
      for (const Column& column : columns) add_numbers(sha, {&c.at(column.name)[row], 1});
    }
    return sha.hex();
  };
  const auto digest = answer.json()["digest"];
  CHECK(digest["plant"] == digest_of(plant_columns()));
  CHECK(digest["obs"] == digest_of(estimator_columns("obs")));
  CHECK(digest["ekf"] == digest_of(estimator_columns("ekf")));
}

TEST_CASE("run: one file and one seed give one result; the seed, the key and the noise run change it",
          "[tools][property]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const auto digest = [&](std::vector<std::string> options) {
    options.insert(options.begin(), {"run", file, "--json"});
    const Answer answer = folder.run(options);
    INFO(answer.err);
    REQUIRE(answer.status == 0);
    return answer.json()["digest"];
  };
  const auto first = digest({});
  CHECK(digest({}) == first);
  CHECK(digest({"--trace", folder.file("t.csv"), "--figure", folder.file("f.svg")}) == first);
  CHECK(digest({"--seed", "5"}) == first);
  CHECK(digest({"--seed", "6"})["ekf"] != first["ekf"]);
  CHECK(digest({"--set", "seed=6"}) == digest({"--seed", "6"}));
  CHECK(digest({"--set", "seed=6", "--seed", "5"}) == first);  // --seed wins
  CHECK(digest({"--run", "1"})["ekf"] != first["ekf"]);
  CHECK(digest({"--set", "belief.rotor_resistance=1.3"})["obs"] != first["obs"]);
}

TEST_CASE("run: an estimator more leaves plant and neighbours as they were", "[tools][property]") {
  const Folder folder;
  const std::string text = scenario_text();
  const std::string file = folder.write("s.toml", text);
  const std::string more = folder.write(
      "more.toml",
      replaced(text, "[[estimator]]", "[[estimator]]\nname = \"red\"\nkind = \"reduced_order\"\n\n[[estimator]]"));
  const auto before = folder.run({"run", file, "--json"}).json()["digest"],
             after = folder.run({"run", more, "--json"}).json()["digest"];
  REQUIRE(after.contains("red"));
  for (const char* name : {"plant", "obs", "ekf"}) CHECK(before[name] == after[name]);
}

TEST_CASE("run: a summary for people, a figure, and silence when asked", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const Answer answer = folder.run({"run", file, "--figure", folder.file("f.svg")});
  REQUIRE(answer.status == 0);
  CHECK_THAT(answer.out, Catch::Contains("Short test drive") && Catch::Contains("speed rms") &&
                             Catch::Contains("ekf") && Catch::Contains("f.svg"));
  const std::string svg = content(folder.file("f.svg"));
  CHECK_THAT(svg, Catch::Contains("estimated minus true speed, rpm"));
  CHECK(svg.size() < 200000);
  const Answer quiet = folder.run({"run", file, "--quiet"});
  CHECK(quiet.out.empty());
  CHECK(quiet.err.empty());
}

TEST_CASE("run: a lost estimator is 1, and says so", "[tools][command]") {
  const Folder folder;
  // Believing half of the rotor resistance, with a band of 0.1 % of rated speed: under load no estimate can stay inside.
  const std::string file = folder.write("s.toml", scenario_text());
  const Answer answer =
      folder.run({"run", file, "--json", "--set", "belief.rotor_resistance=0.5", "--set", "score.lost_error=0.001"});
  INFO(answer.err);
  CHECK(answer.status == 1);
  CHECK(answer.json()["status"] == "lost");
  CHECK(answer.json()["estimators"]["ekf"]["lost_at_s"].is_number());
}

TEST_CASE("run: a diverged plant is 1, named, and the rows done are kept", "[tools][command]") {
  const Folder folder;
  // Forward Euler turns a rotating flux by h w and lengthens it by sqrt(1 + (h w)^2): at rated speed and 4 ms by half a step.
  std::string text = scenario_text();
  for (const char* key : {"plant_step_s = 50e-6", "control_period_s = 100e-6", "trace_period_s = 100e-6"}) {
    text = replaced(text, key, std::string(key).substr(0, std::string(key).find('=')) + "= 4e-3");
  }
  text = replaced(text, "duration_s = 0.3", "duration_s = 100.0");
  text = replaced(text, "method = \"rk4\"", "method = \"euler\"");
  text = text.substr(0, text.find("[supply]")) +
         "[supply]\nkind = \"mains\"\nline_voltage_V = 400.0\nfrequency_Hz = 50.0\n";
  text = replaced(text, "start = \"magnetised\"", "start = \"standstill\"");
  const Answer answer = folder.run({"run", folder.write("s.toml", text), "--json", "--trace", folder.file("t.csv"),
                                    "--figure", folder.file("f.svg")});
  INFO(answer.err);
  REQUIRE(answer.status == 1);
  CHECK_THAT(content(folder.file("f.svg")), Catch::Contains("DIVERGED at "));
  const auto j = answer.json();
  CHECK(j["status"] == "diverged");
  CHECK(j["diverged"]["at_s"].get<double>() > 0.0);
  CHECK_FALSE(j["diverged"]["what"].get<std::string>().empty());
  CHECK(read_trace(folder.file("t.csv")).at("time_s").size() > 1);
}

TEST_CASE("run: events stand in JSON, summary and figure, with their tick and time", "[tools][contract]") {
  const Folder folder;
  const std::string events = R"([[event]]
at_s = 0.15
kind = "speed_from"
estimator = "ekf"
[[event]]
at_s = 0.12001
kind = "speed_sensor_fault"
fault = "stuck"
)";
  const std::string file = folder.write("s.toml", scenario_text() + events);
  const auto j = folder.run({"run", file, "--json"}).json();
  REQUIRE(j["events"].size() == 2);
  CHECK(j["events"][0] == nlohmann::json{{"tick", 1201}, {"time_s", 1201 * 100e-6}, {"what", "speed sensor: stuck"}});
  CHECK(j["events"][1]["tick"] == 1500);
  CHECK(j["events"][1]["what"] == "speed from ekf");
  CHECK(folder.run({"run", folder.write("none.toml", scenario_text()), "--json"}).json()["events"].empty());
  const Answer people = folder.run({"run", file, "--figure", folder.file("f.svg")});
  CHECK_THAT(people.out, Catch::Contains("Events") && Catch::Contains("0.1201  speed sensor: stuck"));
  CHECK_THAT(content(folder.file("f.svg")),
             Catch::Contains("speed sensor: stuck") && Catch::Contains("speed from ekf"));
  const Answer late = folder.run({"run", file, "--set", "event.1.at_s=0.31"});
  CHECK(late.status == 2);
  CHECK_THAT(late.err, Catch::Contains("--set:event.1.at_s") && Catch::Contains("ends at 0.3 s"));
}
