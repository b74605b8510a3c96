// check --keys and --schema through the built command.
#include <catch2/catch.hpp>
#include <set>

#include "tests/tools/command.hpp"

using namespace slipbench::test;

TEST_CASE("command: --keys gives a line a key with its full name", "[tools][command]") {
  const Folder folder;
  const Answer text = folder.run({"check", "--keys"});
  REQUIRE(text.status == 0);
  CHECK(text.err.empty());
  const Answer answer = folder.run({"check", "--keys", "--json"});
  REQUIRE(answer.status == 0);
  const auto document = answer.json();
  CHECK(document.size() == 2);
  CHECK(document["keys"].size() > 120);
  std::set<std::string> sections;
  for (const auto& section : document["sections"]) sections.insert(section["section"].get<std::string>());
  for (const auto& key : document["keys"]) {
    const std::string name = key["key"], meaning = key["meaning"];
    INFO(name);
    CHECK(sections.count(key["section"]) == 1);
    bool found = false;
    std::istringstream lines(text.out);
    for (std::string line; std::getline(lines, line);) {
      found = found || (line.rfind("  " + name + " ", 0) == 0 && line.find(meaning) != std::string::npos);
    }
    CHECK(found);
  }
  const auto resistance = std::find_if(document["keys"].begin(), document["keys"].end(),
                                       [](const auto& key) { return key["key"] == "machine.rotor_resistance_ohm"; });
  REQUIRE(resistance != document["keys"].end());
  CHECK((*resistance)["unit"] == "ohm");
  CHECK((*resistance)["required"] == true);
  CHECK((*resistance)["minimum_excluded"] == true);
  CHECK((*resistance)["default"].is_null());
}

TEST_CASE("command: --keys and --schema in their forms", "[tools][command]") {
  const Folder folder;
  const Answer tables = folder.run({"check", "--keys", "--markdown"});
  CHECK(tables.status == 0);
  CHECK_THAT(tables.out, Catch::Contains("### `[[load]]`") && Catch::Contains("| `load[].kind` |"));
  CHECK(folder.run({"check", "--schema"}).json()["$schema"] == "http://json-schema.org/draft-07/schema#");
  CHECK(folder.run({"check", "--schema", "machine"}).json()["required"] == nlohmann::json::array({"machine"}));
  CHECK(folder.run({"check", "--keys", "--quiet"}).out.empty());
  CHECK(folder.run({"--man"}).out.rfind(".\\\"", 0) == 0);
  CHECK(folder.run({"--completion", "zsh"}).out.rfind("#compdef slipbench", 0) == 0);
}

TEST_CASE("command: --keys beside a file, and check with neither, are refused", "[tools][command]") {
  const Folder folder;
  const std::string file = folder.write("s.toml", scenario_text());
  const Answer both = folder.run({"check", file, "--keys", "--json"});
  CHECK(both.status == 2);
  CHECK(both.json()["error"]["key"] == "--keys");
  CHECK_THAT(both.err, Catch::Contains("reads none"));
  CHECK(folder.run({"check"}).status == 2);
  CHECK_THAT(folder.run({"check"}).err, Catch::Contains("check needs a FILE"));
  CHECK(folder.run({"--completion", "fsh"}).status == 2);
}
