// sweep --search as a person and a script meet it.
#include <catch2/catch.hpp>

#include "tests/tools/command.hpp"

using namespace slipbench::test;
using Catch::Contains;

namespace {

const char* const plan_text = R"(scenario = "drive.toml"
[[vary]]
key = "belief.rotor_resistance"
values = [0.7, 1.5]
[[vary]]
key = "belief.stator_resistance"
values = [0.8, 1.2]
)";

}  // namespace

TEST_CASE("search: JSON, and a file that `run` gives the same figure for, to the bit", "[tools][command][contract]") {
  const Folder folder;
  folder.write("drive.toml", scenario_text());
  const std::string plan = folder.write("plan.toml", plan_text), out = folder.file("worst.toml");
  const Answer answer =
      folder.run({"sweep", plan, "--search", "ekf.flux_rmse_Wb", "--budget", "20", "--write", out, "--json"});
  INFO(answer.err);
  REQUIRE(answer.status == 0);
  const auto search = answer.json()["search"];
  CHECK(search["figure"] == "ekf.flux_rmse_Wb");
  CHECK(search["runs"].get<int>() <= 20);
  CHECK(search["best"].size() == 2);
  const double value = search["value"], mean = search["fresh"]["mean"];
  CHECK(search["fresh"]["ci95"][0].get<double>() < mean);
  CHECK(search["fresh"]["ci95"][1].get<double>() > mean);
  CHECK(search["file"] == out);
  const Answer repeated = folder.run({"run", out, "--json"});
  REQUIRE(repeated.status == 0);
  CHECK(repeated.json()["estimators"]["ekf"]["flux_rmse_Wb"].get<double>() == value);

  const Answer told = folder.run({"sweep", plan, "--search", "ekf.flux_rmse_Wb", "--budget", "20"});
  CHECK(told.status == 0);
  CHECK_THAT(told.out,
             Contains("worst ekf.flux_rmse_Wb") && Contains("On 5 other noise runs") && Contains("--set belief."));
}

TEST_CASE("search: what it refuses", "[tools][command][contract]") {
  const Folder folder;
  const std::string scenario = folder.write("drive.toml", scenario_text()), plan = folder.write("plan.toml", plan_text);
  const auto refused = [&](std::vector<std::string> more, const std::string& text) {
    std::vector<std::string> all = {"sweep", plan};
    all.insert(all.end(), more.begin(), more.end());
    const Answer answer = folder.run(all);
    CHECK(answer.status == 2);
    CHECK_THAT(answer.err, Contains(text));
  };
  refused({"--search", "ekf.flux_rms"}, "the nearest is ekf.flux_rmse_Wb");
  refused({"--budget", "20"}, "--budget needs --search");
  refused({"--search", "ekf.flux_rmse_Wb", "--store", "a.sqlite"}, "--store means nothing with --search");
  refused({"--search", "ekf.flux_rmse_Wb", "--write", "a.txt"}, "ends in .toml");
  refused({"--search", "ekf.flux_rmse_Wb", "--write", scenario}, "is what the case is made from");
  CHECK(content(scenario) == scenario_text());
}

TEST_CASE("search: Ctrl-C keeps the worst so far", "[tools][command]") {
  const Folder folder;
  folder.write("drive.toml", scenario_text());
  const std::string plan = folder.write("plan.toml", plan_text), out = folder.file("worst.toml");
  const Answer answer = folder.run({"sweep", plan, "--search", "ekf.flux_rmse_Wb", "--budget", "20000", "--threads",
                                    "1", "--isa", "double", "--write", out, "--json"},
                                   "timeout --preserve-status -s INT 3");
  CHECK(answer.status == 130);
  const auto search = answer.json()["search"];
  CHECK(search["interrupted"] == true);
  CHECK(search["best"].size() == 2);
  CHECK(search["fresh"]["mean"].is_null());
  const auto figure = folder.run({"run", out, "--json"}).json()["estimators"]["ekf"]["flux_rmse_Wb"];
  CHECK(figure.get<double>() == search["value"].get<double>());
}
