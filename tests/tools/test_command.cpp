// The built command: exit statuses and error documents, as scripts see them.
#include <catch2/catch.hpp>

#include "tests/tools/command.hpp"

using namespace slipbench::test;

namespace {

// A refusal with --json: the document on standard output, the same text on standard error.
nlohmann::json refused(const Answer& answer, int status) {
  INFO(answer.out << answer.err);
  REQUIRE(answer.status == status);
  const auto document = answer.json();
  REQUIRE(document.size() == 1);
  const auto error = document.at("error");
  CHECK(error.size() == 4);
  for (const char* key : {"place", "key", "message", "code"}) CHECK(error.at(key).is_string());
  const std::string place = error["place"], message = error["message"];
  CHECK(answer.err == (place.empty() ? "" : place + ": ") + message + "\n");
  return error;
}

}  // namespace

TEST_CASE("command: bad usage is 2, with and without --json", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  CHECK(folder.run({}).status == 2);
  CHECK(folder.run({"runn", file}).status == 2);
  const Answer plain = folder.run({"run", file, "--sead", "3"});
  CHECK(plain.status == 2);
  CHECK(plain.out.empty());
  CHECK_THAT(plain.err, Catch::Contains("--seed"));
  CHECK(refused(folder.run({"run", file, "--sead", "3", "--json"}), 2)["code"] == "usage");
  CHECK(folder.run({"check", file, "--runs", "3"}).status == 2);
  CHECK(folder.run({"--help"}).status == 0);
  CHECK(folder.run({"run", "--help"}).status == 0);
  CHECK(folder.run({"--version"}).out.rfind("slipbench ", 0) == 0);
}

TEST_CASE("command: a verb given the wrong kind of file says which it wants", "[tools][command]") {
  const Folder folder;
  const std::string text = scenario_text();
  const std::size_t from = text.find("[machine]"), to = text.find("[shaft]");
  const std::string machine =
      folder.write("m.toml", "title = \"Test machine\"\nsource = \"invented\"\n" + text.substr(from, to - from));
  const std::string plan = folder.write("p.toml", "scenario = \"s.toml\"\n");
  const std::string system = folder.write("sys.toml", "[system]\nA = [[0.0]]\nB = [[1.0]]\nC = [[1.0]]\n");
  const std::string scenario = folder.write("s.toml", text);
  const auto told = [&](const std::vector<std::string>& words) {
    return refused(folder.run(words), 2)["message"].get<std::string>();
  };
  for (const std::string verb : {"run", "compare"}) {
    for (const std::string& file : {machine, system})
      CHECK_THAT(told({verb, file, "--json"}), Catch::Contains(verb + " wants a scenario"));
  }
  CHECK_THAT(told({"compare", plan, "--json"}), Catch::Contains("compare wants a scenario"));
  CHECK_THAT(told({"run", plan, "--json"}), Catch::Contains("this is a sweep plan: name one of its cases"));
  CHECK_THAT(told({"run", plan, "--case", "1", "--json"}), Catch::Contains("the plan has cases 0 to 0"));
  CHECK_THAT(told({"run", scenario, "--case", "0", "--json"}), Catch::Contains("for a sweep plan only"));
  for (const std::string& file : {machine, scenario, system})
    CHECK_THAT(told({"sweep", file, "--json"}), Catch::Contains("sweep wants a sweep plan"));
  const Answer facts = folder.run({"check", machine, "--json"});
  REQUIRE(facts.status == 0);
  CHECK(facts.json()["kind"] == "machine file");
  CHECK(facts.json()["title"] == "Test machine");
  CHECK(facts.json()["facts"]["source"] == "invented");
  // sigma = 1 - L_m^2 / (L_s L_r) with L_s = L_r = 0.1782 H, by hand; the difference of near ones loses a digit.
  CHECK(facts.json()["facts"]["leakage_factor"].get<double>() ==
        Approx(1.0 - 0.172 * 0.172 / (0.1782 * 0.1782)).epsilon(1e-14));
  CHECK(facts.json()["facts"]["rotor_time_constant_s"].get<double>() == Approx(0.1782 / 1.25).epsilon(1e-14));
  CHECK(folder.run({"check", machine, "--seed", "1"}).status == 2);
}

TEST_CASE("command: check reads a scenario and runs nothing", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const Answer answer = folder.run({"check", file, "--set", "run.duration_s=1000000.0"});
  CHECK(answer.status == 0);
  CHECK_THAT(answer.out, Catch::Contains("a valid scenario") && Catch::Contains("extended_kalman"));
  CHECK(folder.run({"check", file, "--quiet"}).out.empty());
}

TEST_CASE("command: an output that cannot be written is 3, found before the run", "[tools][command]") {
  const Folder folder;
  // A run of hours: the refusal must come at once (the time limit would give 124).
  const std::string file =
      folder.write("s.toml", replaced(scenario_text(), "duration_s = 0.3", "duration_s = 100000.0"));
  for (const std::string option : {"--trace", "--figure"}) {
    const std::string target = folder.file("no/such/folder/x") + (option == "--trace" ? ".csv" : ".svg");
    const auto error = refused(folder.run({"run", file, option, target, "--json"}, "timeout 20"), 3);
    CHECK(error["code"] == "outside");
    CHECK_THAT(error["message"].get<std::string>(), Catch::Contains(target));
  }
  CHECK(folder.run({"compare", file, "--figure", folder.file("no/such/x.svg")}, "timeout 20").status == 3);
  const Answer full =
      folder.run({"run", file, "--trace", "/dev/full"}, "timeout 60");  // found under way, the run is stopped
  CHECK(full.status == 3);
}

TEST_CASE("command: a standard output that takes nothing is 3", "[tools][command]") {
  if (!fs::exists("/dev/full")) return;
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const int raw = std::system(("'" SLIPBENCH_COMMAND "' check '" + file + "' > /dev/full 2> /dev/null").c_str());
  CHECK(WEXITSTATUS(raw) == 3);
}

TEST_CASE("command: interrupted, a run keeps what was done and ends with 130", "[tools][command]") {
  const Folder folder;
  const std::string file =
      folder.write("s.toml", replaced(scenario_text(), "duration_s = 0.3", "duration_s = 100000.0"));
  const std::string signal = GENERATE("INT", "TERM");
  // In the foreground `timeout` signals once; otherwise twice, and a second interrupt ends the command at once.
  const std::string before = "timeout --foreground --preserve-status --signal=" + signal + " 1.5";
  const Answer run =
      folder.run({"run", file, "--json", "--trace", folder.file("t.csv"), "--set", "run.trace_period_s=1e-3"}, before);
  INFO(run.err);
  REQUIRE(run.status == 130);
  const auto document = run.json();
  CHECK(document["interrupted"] == true);
  const double simulated = document["simulated_s"];
  CHECK(simulated > 0.0);
  std::istringstream lines(content(folder.file("t.csv")));
  std::string line, last;
  while (std::getline(lines, line)) last = line;
  CHECK(std::stod(last) ==
        Approx(simulated).epsilon(0).margin(2e-3));  // the last row, a trace period or so before the stop
  const Answer compare = folder.run({"compare", file, "--json", "--runs", "4"}, before);
  INFO(compare.err);
  CHECK(compare.status == 130);
  CHECK(compare.json()["runs"] == 0);
}
