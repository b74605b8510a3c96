// slipbench sweep: sensitivities in summary and JSON, figures of each kind, what is refused.
#include <catch2/catch.hpp>

#include "tests/tools/command.hpp"

using namespace slipbench::test;

namespace {

// A tenth of a second of the test's drive: seconds for hundreds of cases.
std::string short_drive() {
  return replaced(replaced(scenario_text(), "duration_s = 0.3", "duration_s = 0.1"), "from_s = 0.05", "from_s = 0.02");
}

std::string drawn(const std::string& kind, int count) {
  return "title = \"Drawn, invented\"\nscenario = \"s.toml\"\n[sample]\nkind = \"" + kind +
         "\"\ncount = " + std::to_string(count) +
         "\n[[sample.key]]\nkey = \"belief.stator_resistance\"\ndistribution = \"uniform\"\nlow = 0.5\nhigh = 1.5\n"
         "[[sample.key]]\nkeys = [\"belief.stator_leakage\", \"belief.rotor_leakage\"]\ndistribution = \"uniform\"\n"
         "low = 0.99\nhigh = 1.01\n";
}

std::size_t times(const std::string& text, const std::string& what) {
  std::size_t found = 0;
  for (std::size_t at = text.find(what); at != std::string::npos; at = text.find(what, at + 1)) ++found;
  return found;
}

void check_svg(const Folder& folder, const std::string& name) {
  if (std::system("xmllint --version > /dev/null 2>&1") != 0) {
    WARN("xmllint is not installed");
    return;
  }
  CHECK(std::system(("xmllint --noout '" + folder.file(name) + "'").c_str()) == 0);
}

}  // namespace

TEST_CASE("sweep: a Saltelli plan tells both orders, with intervals and lost points", "[tools][contract]") {
  const Folder folder;
  folder.write("s.toml", short_drive());
  const std::string plan = folder.write("p.toml", drawn("saltelli", 32)), store = folder.file("p.sqlite");
  const Answer answer = folder.run({"sweep", plan, "--store", store, "--json", "--figure", folder.file("p.svg")});
  INFO(answer.err);
  REQUIRE(answer.status == 0);
  const auto j = answer.json();
  for (const char* figure : {"obs.speed_rmse_rpm", "ekf.speed_rmse_rpm", "drive.speed_tracking_rmse_rpm"}) {
    INFO(figure);
    CHECK(j["sensitivity_points"][figure]["used"] == 32);
    CHECK(j["sensitivity_points"][figure]["lost"] == 0);
  }
  CHECK(j["sensitivity"].size() == 3);
  const auto& keys = j["sensitivity"]["obs.speed_rmse_rpm"];
  const auto &resistance = keys["belief.stator_resistance"],
             &leakage = keys["belief.stator_leakage+belief.rotor_leakage"];
  for (const auto& key : {resistance, leakage}) {
    for (const std::string order : {"first", "total"}) {
      const double value = key[order], low = key[order + "_ci95"][0], high = key[order + "_ci95"][1];
      CHECK(low <= value);
      CHECK(value <= high);
    }
  }
  // A resistance off by half against leakages off by 1 %: the first decides nearly all. The interval of 32 points is wide.
  CHECK(resistance["total"].get<double>() > 0.9);
  CHECK(leakage["total"].get<double>() < 0.1);
  check_svg(folder, "p.svg");
  CHECK_THAT(content(folder.file("p.svg")),
             Catch::Contains("Drawn, invented") && Catch::Contains("belief.stator_resistance"));

  // The same command from the finished store: the same numbers, to the digit; and for people a table.
  const auto again = folder.run({"sweep", plan, "--store", store, "--json", "--threads", "1"}).json();
  CHECK(again["sensitivity"] == j["sensitivity"]);
  const Answer people = folder.run({"sweep", plan, "--store", store, "--figure-of", "flux_rmse_Wb"});
  CHECK_THAT(people.out,
             Catch::Contains("Which key decides") && Catch::Contains("total") && Catch::Contains("ekf.flux_rmse_Wb"));
  CHECK(people.out.find("belief.stator_resistance", people.out.find("Which key")) <
        people.out.find("belief.stator_leakage+", people.out.find("Which key")));
}

TEST_CASE("sweep: shards tell no sensitivity; joined, they tell the whole plan's", "[tools][property]") {
  const Folder folder;
  folder.write("s.toml", short_drive());
  const std::string plan = folder.write("p.toml", drawn("saltelli", 32));
  const auto whole = folder.run({"sweep", plan, "--store", folder.file("w.sqlite"), "--json"}).json();
  std::vector<std::string> merge = {"sweep", plan, "--store", folder.file("m.sqlite"), "--json"};
  for (const std::string i : {"0", "1"}) {
    const auto part =
        folder.run({"sweep", plan, "--store", folder.file(i + ".sqlite"), "--shard", i + "/2", "--json"}).json();
    CHECK_FALSE(part.contains("sensitivity"));
    merge.insert(merge.end(), {"--merge", folder.file(i + ".sqlite")});
  }
  const auto joined = folder.run(merge).json();
  CHECK(joined["sensitivity"] == whole["sensitivity"]);

  // One shard alone: units of 64 of the 128 cases; the other base points are lost, and said to be.
  const auto half =
      folder.run({"sweep", plan, "--store", folder.file("h.sqlite"), "--merge", folder.file("0.sqlite"), "--json"});
  CHECK(half.status == 1);
  CHECK(half.json()["sensitivity_points"]["obs.speed_rmse_rpm"]["lost"] == 16);
}

TEST_CASE("sweep: plain draws tell first orders, and that totals need another plan", "[tools][contract]") {
  const Folder folder;
  folder.write("s.toml", short_drive());
  const std::string plan = folder.write("p.toml", "runs = 2\n" + drawn("latin_hypercube", 64)),
                    store = folder.file("p.sqlite");
  const Answer answer = folder.run({"sweep", plan, "--store", store, "--figure", folder.file("p.svg")});
  INFO(answer.err);
  REQUIRE(answer.status == 0);
  CHECK_THAT(answer.out,
             Catch::Contains("of the mean of a case's 2 runs") && Catch::Contains("need kind = \"saltelli\""));
  check_svg(folder, "p.svg");
  const auto j = folder.run({"sweep", plan, "--store", store, "--json"}).json();
  const auto& key = j["sensitivity"]["obs.speed_rmse_rpm"]["belief.stator_resistance"];
  CHECK(key["first"].get<double>() > 0.7);
  CHECK(key["total"].is_null());
  CHECK(key["total_ci95"].is_null());
}

TEST_CASE("sweep: figures of a grid, by one key and by two, in numbers and in words", "[tools][command]") {
  const Folder folder;
  folder.write("s.toml", short_drive());
  const std::string head = "scenario = \"s.toml\"\n", vary = "[[vary]]\nkey = \"belief.rotor_resistance\"\n";
  const std::string map = folder.write("map.toml", "title = \"A map\"\n" + head + vary + "values = [2.0, 0.5, 1.0]\n" +
                                                       "[[vary]]\nkey = \"estimator.0.kind\"\n" +
                                                       "values = [\"luenberger\", \"reduced_order\"]\n");
  const Answer first =
      folder.run({"sweep", map, "--store", folder.file("map.sqlite"), "--figure", folder.file("map.svg")});
  INFO(first.err);
  REQUIRE(first.status == 0);
  CHECK_THAT(first.out, !Catch::Contains("Which key decides"));
  check_svg(folder, "map.svg");
  const std::string drawn_map = content(folder.file("map.svg"));
  CHECK(times(drawn_map, "<rect") == 6 + 60 + 1);  // cells, the scale beside them, the ground
  CHECK_THAT(drawn_map,
             Catch::Contains("A map") && Catch::Contains("reduced_order") && Catch::Contains("obs: speed rmse, rpm"));
  CHECK(drawn_map.find(">0.5<") < drawn_map.find(">2<"));  // numbers rise, whatever the plan's order

  const std::string line = folder.write("line.toml", "runs = 3\n" + head + vary + "from = 0.5\nto = 1.5\ncount = 4\n");
  REQUIRE(folder
              .run({"sweep", line, "--store", folder.file("l.sqlite"), "--figure", folder.file("l.svg"), "--figure-of",
                    "angle_rmse_deg", "--quiet"})
              .status == 0);
  check_svg(folder, "l.svg");
  const std::string lines = content(folder.file("l.svg"));
  CHECK(times(lines, "stroke-linejoin") == 2);
  CHECK(times(lines, "<circle") == 8);
  CHECK_THAT(lines, Catch::Contains("angle rmse, deg") && Catch::Contains(">obs<") && Catch::Contains(">ekf<"));
}

TEST_CASE("sweep: a figure that there is not is refused before anything runs", "[tools][edge]") {
  const Folder folder;
  folder.write("s.toml", short_drive());
  const std::string plan = folder.write("p.toml", "scenario = \"s.toml\"\n");
  const std::string store = folder.file("p.sqlite"), svg = folder.file("p.svg");
  const Answer wrong =
      folder.run({"sweep", plan, "--store", store, "--figure", svg, "--figure-of", "obs.speed_rms_rpm"});
  CHECK(wrong.status == 2);
  CHECK_THAT(wrong.err, Catch::Contains("nearest is obs.speed_rmse_rpm"));
  const Answer idle = folder.run({"sweep", plan, "--store", store, "--figure-of", "speed_rmse_rpm"});
  CHECK(idle.status == 2);
  CHECK_THAT(idle.err, Catch::Contains("--figure FILE.svg"));
  CHECK(folder.run({"sweep", plan, "--store", store, "--figure", folder.file("no/such.svg")}).status == 3);
  CHECK_FALSE(fs::exists(store));
  CHECK(folder.run({"sweep", plan, "--store", store, "--figure", svg, "--quiet"}).status == 0);  // one case: a strip
  check_svg(folder, "p.svg");
}
