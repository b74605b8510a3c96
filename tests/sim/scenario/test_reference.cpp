// The table of keys as rows: complete, and with the defaults that a reader of a bare file would meet.
#include <catch2/catch.hpp>

#include "sim/scenario/reference.hpp"
#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using namespace scenario_tests;

namespace {

const KeyReference& row(const std::vector<SectionReference>& sections, const std::string& path, const char* kind = "") {
  for (const SectionReference& section : sections) {
    for (const KeyReference& key : section.keys) {
      if (key.key->path != path) continue;
      const auto& when = key.key->when;
      if (*kind == '\0' || std::count(when.begin(), when.end(), std::string_view(kind)) > 0) return key;
    }
  }
  throw std::runtime_error("no row " + path);
}

}  // namespace

TEST_CASE("reference: every key of the table stands once, under its section", "[scenario][keys]") {
  const auto sections = scenario_reference();
  CHECK(sections.size() == scenario_sections().size());
  std::vector<const Key*> seen;
  for (const SectionReference& section : sections) {
    for (const KeyReference& key : section.keys) {
      CHECK(key.key->section() == section.section->path);
      CHECK_FALSE(key.allowed_text().empty());
      CHECK_FALSE(key.default_text().empty());
      seen.push_back(key.key);
    }
  }
  std::sort(seen.begin(), seen.end());
  CHECK(std::adjacent_find(seen.begin(), seen.end()) == seen.end());
  CHECK(seen.size() == scenario_keys().size());
}

TEST_CASE("reference: defaults are those of the documented format", "[scenario][keys]") {
  // The comments of the scenario format: rk4, standstill, one period of delay, lost past 0.1 of rated speed.
  const auto sections = scenario_reference();
  CHECK(row(sections, "run.method").default_text() == "rk4");
  CHECK(row(sections, "run.start").default_text() == "standstill");
  CHECK(row(sections, "run.duration_s").default_text() == "required");
  CHECK(row(sections, "controller.delay_periods").default_text() == "1");
  CHECK(row(sections, "controller.dead_time_compensation").default_text() == "true");
  CHECK(row(sections, "score.lost_error").default_text() == "0.1");
  CHECK(row(sections, "score.to_s").default_text() == "the end of the run");
  CHECK(row(sections, "sensors.current.offset_A").default_text() == "[0, 0, 0]");
  CHECK(row(sections, "sensors.dc_link.offset_V").holds == Holds::number);
  CHECK(row(sections, "load[].torque_Nm", "profile").holds == Holds::knots);
  CHECK(row(sections, "load[].torque_Nm", "constant_torque").holds == Holds::number);
  CHECK(row(sections, "estimator[].load_torque").holds == Holds::truth);
  CHECK(row(sections, "seed").allowed_text() == "whole, 0 <= x");
  CHECK(row(sections, "run.plant_step_s").allowed_text() == "0 < x <= 1");
}

TEST_CASE("reference: a default written out changes nothing", "[scenario][keys]") {
  // Read with and without each number that can be written out and is not yet: what is read must be the same. The
  // examples' own kinds decide which rows belong; belief.dc_link stands in for a sensor that the first example has.
  int tried = 0;
  for (const std::string& text : {whole_text(), mains_text()}) {
    Scenario plain = read(text);
    for (const SectionReference& section : scenario_reference()) {
      const std::string head = section.head();
      if (head.empty() || text.find("\n" + head + "\n") == std::string::npos) continue;
      for (const KeyReference& key : section.keys) {
        const auto* slot = std::get_if<double& (*)(Scenario&, std::size_t)>(&key.key->slot);
        const std::string dotted = first_element(key.key->path);
        const bool there = text.find("\n" + std::string(key.key->name()) + " =") != std::string::npos;
        if (slot == nullptr || !std::holds_alternative<double>(key.fallback) || there) continue;
        if (find_key(plain, dotted) != key.key || dotted == "belief.dc_link") continue;
        INFO(dotted);
        Scenario written = read(text, {{dotted, key.default_text()}});
        CHECK((*slot)(written, 0) == (*slot)(plain, 0));
        ++tried;
      }
    }
  }
  CHECK(tried > 3);
}

TEST_CASE("reference: heads and first elements are written as a file and --set take them", "[scenario][keys]") {
  for (const SectionReference& section : scenario_reference()) {
    if (section.section->path == "load[]") CHECK(section.head() == "[[load]]");
    if (section.section->path == "sensors.current") CHECK(section.head() == "[sensors.current]");
    if (section.section->path.empty()) CHECK(section.head().empty());
  }
  CHECK(first_element("load[].kind") == "load.0.kind");
  CHECK(first_element("run.method") == "run.method");
}
