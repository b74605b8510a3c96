// The built command's `analyse` and `design` on drives: operating point, maps, gain files.
#include <catch2/catch.hpp>

#include "tests/tools/command.hpp"

using namespace slipbench::test;

namespace {

nlohmann::json answer_of(const Folder& folder, std::vector<std::string> words) {
  words.push_back("--json");
  const Answer answer = folder.run(words);
  INFO(answer.err);
  REQUIRE(answer.status == 0);
  return answer.json();
}

std::size_t lines(const std::string& text) {
  return static_cast<std::size_t>(std::count(text.begin(), text.end(), '\n'));
}

std::string machine_text() {
  const std::string text = scenario_text();
  const std::size_t from = text.find("[machine]"), to = text.find("[shaft]");
  return text.substr(from, to - from);
}

}  // namespace

TEST_CASE("analyse: a drive at its operating point", "[tools][command][contract]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const auto d = answer_of(folder, {"analyse", file});
  CHECK(d["order"] == 5);
  CHECK(d["inputs"].size() == 3);   // two voltages, load torque
  CHECK(d["outputs"].size() == 3);  // two currents, speed: it is measured
  CHECK(answer_of(folder, {"analyse", file, "--set", "sensors.speed.kind=none", "--set",
                           "controller.speed_from=obs"})["outputs"]
            .size() == 2);
  const auto& at = d["operating_point"];
  for (const char* column :
       {"time_s", "speed_rpm", "torque_Nm", "stator_frequency_Hz", "i_d_A", "i_q_A", "rotor_flux_Wb"})
    CHECK(at.contains(column));
  CHECK(at["speed_rpm"] == 0.0);  // the first reference
  // Sampled at the scenario's control period unless another is asked for.
  CHECK(d["discretisation"][0]["period_s"] == 100e-6);
  CHECK(answer_of(folder, {"analyse", file, "--period", "1e-3"})["discretisation"][0]["period_s"] == 1e-3);
  // At standstill the voltages still move all states, and what is measured shows them.
  CHECK(d["controllable_rank"] == 5);
  CHECK(d["observable_rank"] == 5);
  const Answer text = folder.run({"analyse", file, "--figure", folder.file("d.svg")});
  REQUIRE(text.status == 0);
  CHECK_THAT(text.out, Catch::Contains("Operating point") && Catch::Contains("zero_order_hold"));
}

TEST_CASE("analyse: a machine file on its rated mains, speed held", "[tools][command]") {
  const Folder folder;
  const auto d = answer_of(folder, {"analyse", folder.write("m.toml", machine_text())});
  CHECK(d["order"] == 4);
  CHECK(d["stability"] == "stable");
  CHECK(d["operating_point"]["speed_rpm"].get<double>() == Approx(1440.0).epsilon(1e-12));
  CHECK(d["operating_point"]["stator_frequency_Hz"].get<double>() == Approx(50.0).epsilon(1e-12));
}

TEST_CASE("analyse --map: where speed can be seen", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text()), csv = folder.file("m.csv"),
                    path = folder.file("p.csv");
  const auto d = answer_of(folder, {"analyse", file, "--map", "speed_observability", "--csv", csv, "--path", path,
                                    "--figure", folder.file("m.svg")});
  CHECK(d["map"] == "speed_observability");
  const std::size_t points = d["plane"]["speeds"].get<std::size_t>() * d["plane"]["torques"].get<std::size_t>();
  CHECK(d["smallest_singular_value"].size() == points);
  CHECK(lines(content(csv)) == points + 1);
  CHECK(lines(content(path)) >= 300);
  CHECK(d["path"]["duration_s"].get<double>() == Approx(0.3).epsilon(1e-12));  // a sum of 3000 periods
  // Speed runs from rest, where nothing can be seen, to 500 rpm.
  CHECK(d["path"]["blind_s"].get<double>() > 0.0);
  CHECK(d["path"]["blind_s"].get<double>() < 0.3);
  CHECK_THAT(content(folder.file("m.svg")), Catch::Contains("</svg>"));
  CHECK_THAT(folder.run({"analyse", file, "--map", "speed_observability"}).out,
             Catch::Contains("no speed can be told"));
}

TEST_CASE("analyse --map: where an estimator is stable", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text()), csv = folder.file("e.csv");
  const auto d = answer_of(folder, {"analyse", file, "--map", "estimator_stability", "--csv", csv});
  CHECK(d["estimator"] == "obs");  // the first
  CHECK(d["stable"].get<std::size_t>() > d["unstable"].get<std::size_t>());
  CHECK(lines(content(csv)) == d["points"].size() + 1);
  CHECK(answer_of(folder, {"analyse", file, "--map", "estimator_stability", "--estimator", "reduced_order"})["kind"] ==
        "reduced_order");
  const Answer unknown = folder.run({"analyse", file, "--map", "estimator_stability", "--estimator", "obz"});
  CHECK(unknown.status == 2);
  CHECK_THAT(unknown.err, Catch::Contains("the nearest is obs"));
}

TEST_CASE("analyse, design: options that do not go together", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text()), machine = folder.write("m.toml", machine_text());
  const std::string lag = folder.write("lag.toml", "[system]\nA = [[-2.0]]\nB = [[2.0]]\nC = [[1.0]]\n");
  const auto told = [&](std::vector<std::string> words) {
    const Answer answer = folder.run(words);
    CHECK(answer.status == 2);
    return answer.err;
  };
  CHECK_THAT(told({"analyse", file, "--csv", "x.csv"}), Catch::Contains("--csv needs --map"));
  CHECK_THAT(told({"analyse", file, "--model", "known_load"}), Catch::Contains("--model needs --map"));
  CHECK_THAT(told({"analyse", file, "--map", "speed"}), Catch::Contains("nearest is speed_observability"));
  CHECK_THAT(told({"analyse", file, "--map", "speed_observability", "--at", "50"}),
             Catch::Contains("--at means nothing with --map"));
  CHECK_THAT(told({"analyse", file, "--map", "speed_observability", "--estimator", "obs"}),
             Catch::Contains("goes with --map estimator"));
  CHECK_THAT(told({"analyse", lag, "--map", "speed_observability"}), Catch::Contains("wants a scenario or a machine"));
  CHECK_THAT(told({"analyse", machine, "--map", "speed_observability", "--model", "known_load"}),
             Catch::Contains("want a scenario"));
  CHECK_THAT(told({"design", machine}), Catch::Contains("this is a machine file"));
  CHECK_THAT(told({"design", file, "--at", "50"}), Catch::Contains("--at is for state-space files"));
  CHECK_THAT(told({"design", lag, "--write", "x.toml"}), Catch::Contains("--write is for scenarios"));
  CHECK_THAT(told({"design", file, "--set", "design.bandwidth_Hz=300"}), Catch::Contains("current_bandwidth_Hz"));
}

TEST_CASE("design: a drive's gains, as a file that a scenario takes", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text()), gains = folder.file("gains.toml");
  const auto d = answer_of(folder, {"design", file, "--write", gains});
  CHECK(d["kind"] == "state_feedback");
  CHECK(d["K"].size() == d["points"].size());
  CHECK(d["residual"].get<double>() < 1e-10);  // relative, of small well-conditioned equations
  CHECK(folder.run({"check", gains}).status == 0);
  std::string own = replaced(scenario_text(), "kind = \"rotor_flux_oriented\"\norientation = \"indirect\"",
                             "kind = \"state_feedback\"\nfile = \"gains.toml\"\norientation = \"indirect\"");
  const auto run = answer_of(folder, {"run", folder.write("own.toml", own)});
  CHECK(run["status"] == "done");
  CHECK(run["mean"]["speed_rpm"].get<double>() > 100.0);  // up to 500 rpm by 0.12 s
  const auto slower = answer_of(folder, {"design", file, "--set", "design.current_bandwidth_Hz=100"});
  CHECK(slower["K"] != d["K"]);
}
