// slipbench compare: shape, agreement with single runs, independence of threads.
#include <catch2/catch.hpp>

#include "tests/tools/command.hpp"

using namespace slipbench::test;

TEST_CASE("compare: JSON has the contract's shape", "[tools][contract]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const Answer answer = folder.run({"compare", file, "--runs", "3", "--json"});
  INFO(answer.err);
  REQUIRE(answer.status == 0);
  const auto j = answer.json();
  CHECK(j["runs"] == 3);
  REQUIRE(j["estimators"].size() == 2);
  for (const char* name : {"obs", "ekf"}) {
    const auto& e = j["estimators"][name];
    CHECK(e["lost_runs"] == 0);
    for (const char* figure : {"speed_rmse_rpm", "speed_bias_rpm", "speed_max_error_rpm", "flux_rmse_Wb",
                               "angle_rmse_deg", "torque_rmse_Nm"}) {
      const double mean = e[figure]["mean"], low = e[figure]["ci95"][0], high = e[figure]["ci95"][1];
      CHECK(low < mean);
      CHECK(mean < high);
    }
    CHECK(e["lost_at_s"]["mean"].is_null());
    CHECK(e["lost_at_s"]["ci95"].is_null());
  }
  bool found = false;
  for (const auto& d : j["differences"]) {
    CHECK(d.size() == 5);
    if (d["figure"] != "speed_rmse_rpm") continue;
    found = true;
    CHECK(d["a"] == "obs");
    CHECK(d["b"] == "ekf");
    const double of_means = j["estimators"]["obs"]["speed_rmse_rpm"]["mean"].get<double>() -
                            j["estimators"]["ekf"]["speed_rmse_rpm"]["mean"].get<double>();
    CHECK(d["mean"].get<double>() == Approx(of_means).epsilon(1e-9));  // all runs paired: the same but for rounding
  }
  CHECK(found);
}

TEST_CASE("compare: run r is what `run --run r` gives", "[tools][property]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const auto single = [&](const char* run) {
    return folder.run({"run", file, "--json", "--run", run})
        .json()["estimators"]["ekf"]["speed_rmse_rpm"]
        .get<double>();
  };
  const auto j = folder.run({"compare", file, "--runs", "2", "--json"}).json();
  CHECK(j["estimators"]["ekf"]["speed_rmse_rpm"]["mean"].get<double>() == 0.5 * (single("0") + single("1")));
}

TEST_CASE("compare: the number of threads changes nothing", "[tools][property]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  for (const bool in_loop : {false, true}) {
    std::vector<std::string> line = {"compare", file, "--runs", "4", "--json"};
    if (in_loop) line.push_back("--in-loop");
    const Answer plain = folder.run(line);
    INFO(plain.err);
    REQUIRE(plain.status == 0);
    for (const char* threads : {"1", "3", "8"}) {
      auto with = line;
      with.insert(with.end(), {"--threads", threads});
      CHECK(folder.run(with).out == plain.out);
    }
  }
}

TEST_CASE("compare: in the loop, each estimator is judged as if it alone were in the file", "[tools][property]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const auto j = folder.run({"compare", file, "--runs", "1", "--in-loop", "--json"}).json();
  for (const std::string name : {"obs", "ekf"}) {
    const auto run = folder.run({"run", file, "--json", "--set", "controller.speed_from=" + name}).json();
    CHECK(j["estimators"][name]["speed_rmse_rpm"]["mean"] == run["estimators"][name]["speed_rmse_rpm"]);
    CHECK(j["estimators"][name]["speed_tracking_rmse_rpm"]["mean"] == run["drive"]["speed_tracking_rmse_rpm"]);
    CHECK(j["estimators"][name]["speed_rmse_rpm"]["ci95"].is_null());  // one run has no interval
  }
}

TEST_CASE("compare: in the loop, a handover under way goes to each estimator in turn", "[tools][property]") {
  const Folder folder;
  const std::string file =
      folder.write("s.toml", scenario_text() + "[[event]]\nat_s = 0.15\nkind = \"speed_from\"\nestimator = \"obs\"\n" +
                                 "[[event]]\nat_s = 0.25\nkind = \"speed_from\"\nestimator = \"measured\"\n");
  const auto j = folder.run({"compare", file, "--runs", "1", "--in-loop", "--json"}).json();
  for (const std::string name : {"obs", "ekf"}) {
    const auto run = folder.run({"run", file, "--json", "--set", "event.0.estimator=" + name}).json();
    CHECK(j["estimators"][name]["speed_tracking_rmse_rpm"]["mean"] == run["drive"]["speed_tracking_rmse_rpm"]);
  }
  CHECK(j["estimators"]["obs"]["speed_tracking_rmse_rpm"]["mean"] !=
        j["estimators"]["ekf"]["speed_tracking_rmse_rpm"]["mean"]);
}

TEST_CASE("compare: in the loop of a controller that takes no speed there is nothing to compare", "[tools][command]") {
  const Folder folder;
  const std::string text = replaced(
      scenario_text(), "kind = \"rotor_flux_oriented\"\norientation = \"indirect\"\nspeed_from = \"measured\"\n",
      "kind = \"volts_per_hertz\"\n");
  const std::string file = folder.write("s.toml", text);
  const Answer refused = folder.run({"compare", file, "--runs", "2", "--in-loop"});
  CHECK(refused.status == 2);
  CHECK_THAT(refused.err, Catch::Contains("volts_per_hertz") && Catch::Contains("takes no speed"));
  CHECK(folder.run({"compare", file, "--runs", "2", "--quiet"}).status == 0);
}

TEST_CASE("compare: tables for people, a figure, and what it refuses", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const Answer answer = folder.run({"compare", file, "--runs", "3", "--figure", folder.file("c.svg")});
  REQUIRE(answer.status == 0);
  CHECK_THAT(answer.out, Catch::Contains("3 noise runs") && Catch::Contains("obs - ekf") && Catch::Contains("0 of 3") &&
                             Catch::Contains("c.svg"));
  CHECK_THAT(content(folder.file("c.svg")), Catch::Contains("speed error, rms, rpm"));
  std::string bare = scenario_text();
  const std::size_t from = bare.find("[[estimator]]"), to = bare.find("[score]");
  bare.erase(from, to - from);
  const Answer none = folder.run({"compare", folder.write("bare.toml", bare)});
  CHECK(none.status == 2);
  CHECK_THAT(none.err, Catch::Contains("no [[estimator]]"));
  CHECK(folder.run({"run", folder.file("bare.toml"), "--quiet"}).status == 0);  // but it runs
}
