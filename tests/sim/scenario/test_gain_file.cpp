// Gain files: what they bring, what overrides them, and where a broken one is told of.
#include <catch2/catch.hpp>
#include <filesystem>
#include <fstream>

#include "sim/scenario/gain_file.hpp"
#include "tests/sim/scenario/texts.hpp"

using namespace slipbench;
using namespace scenario_tests;

namespace {

const std::string gains = R"(format = 1
[controller]
gain_period_s = 1e-4
gain_frequency_Hz = [0.0, 25]
K = [
  [[39.0, 0.0, 6.9, 0.0, 0.19, 0.0], [0.0, 39.0, 0.0, 6.8, 0.0, 0.19]],
  [[39.1, 1.0, 7.0, 180.0, 0.19, 0.01], [-1.0, 39.0, -180.0, 6.8, -0.01, 0.19]],
]
reference_gain = [[[45.0, 0.0], [0.0, 45.0]], [[45.0, -6.0], [6.0, 45.0]]]
[estimator]
gain_frequency_Hz = [0.0]
L = [[[0.4, 0.0], [0.0, 0.4], [-0.004, 0.0], [0.0, -0.004]]]
)";

std::string folder_with(const std::string& text) {
  const auto folder = std::filesystem::path(SLIPBENCH_BINARY_DIR) / "gain_files";
  std::filesystem::create_directories(folder);
  std::ofstream(folder / "g.toml", std::ios::binary) << text;
  return folder.string();
}

// The whole scenario with state feedback, gains from g.toml.
std::string scenario_text(const std::string& more = "") {
  const std::string text = whole_text();
  const std::size_t from = text.find("[controller]"), to = text.find("[", from + 1);
  return text.substr(0, from) +
         "[controller]\nkind = \"state_feedback\"\nintegral_action = false\nfile = \"g.toml\"\n" + more +
         text.substr(to);
}
InputError refused(const std::string& file, const std::string& more = "") {
  const std::string folder = folder_with(file);
  try {
    read_scenario_text(scenario_text(more), "s.toml", folder);
  } catch (const InputError& error) {
    return error;
  }
  FAIL("was not refused");
  return InputError("", "", "", "");
}

}  // namespace

TEST_CASE("gain file: its tables become settings, keys of the scenario win", "[scenario][gains]") {
  const std::string folder = folder_with(gains);
  const Scenario s = read_scenario_text(scenario_text("gain_frequency_Hz = [0.0, 30.0]\n"), "s.toml", folder);
  const SettingTable* K = s.controller.settings.table("K");
  REQUIRE(K != nullptr);
  CHECK(K->count == 2);
  CHECK(K->rows == 2);
  CHECK(K->columns == 6);
  CHECK((*K)(1, 1, 2) == -180.0);
  CHECK((*s.controller.settings.table("gain_frequency_Hz"))(1) == 30.0);
  CHECK(s.controller.settings.value("gain_period_s", 0.0) == 1e-4);
  CHECK(s.controller.settings.table("L") == nullptr);
  // --set reaches a single element.
  const Scenario set =
      read_scenario_text(scenario_text("K = [[[1.0]], [[2.0]]]\n"), "s.toml", folder, {{"controller.K.1.0.0", "3.5"}});
  CHECK((*set.controller.settings.table("K"))(1) == 3.5);
}

TEST_CASE("gain file: what is written reads back the same", "[scenario][gains]") {
  const std::string folder = folder_with(gains);
  const Scenario s = read_scenario_text(scenario_text(), "s.toml", folder);
  GainFile file;
  file.title = "Again \"so\"";
  file.made_for = {{"weights", "none"}};
  file.controller = s.controller.settings;
  const std::string text = gain_file_text(file);
  const Scenario again = read_scenario_text(scenario_text(), "s.toml", folder_with(text));
  for (const char* name : {"gain_frequency_Hz", "K", "reference_gain"}) {
    INFO(text);
    REQUIRE(again.controller.settings.table(name) != nullptr);
    CHECK(again.controller.settings.table(name)->numbers == s.controller.settings.table(name)->numbers);
  }
}

TEST_CASE("gain file: a broken one is told of where it is broken", "[scenario][gains]") {
  const auto at = [](const InputError& error, const std::string& line) {
    INFO(error.place() << ": " << error.message());
    CHECK(error.place().find("g.toml:" + line) != std::string::npos);
    return error.message();
  };
  CHECK(at(refused(with(gains, "K = [", "KK = [")), "5:").find("nearest known key") != std::string::npos);
  CHECK(at(refused(with(gains, "180.0, 0.19, 0.01", "180.0, 0.19")), "7:").find("an array of 5 values") !=
        std::string::npos);
  CHECK(at(refused(with(gains, "[0.0, 45.0]],", "[0.0]],")), "9:").find("array of 1 value") != std::string::npos);
  CHECK(at(refused(with(gains, "[0.0, 25]", "[0.0, \"fast\"]")), "4:").find("\"fast\"") != std::string::npos);
  CHECK(at(refused(with(gains, "[0.0, 25]", "[0.0, -25]")), "4:").find("from 0 to") != std::string::npos);
  CHECK(at(refused(with(gains, "[0.0, 25]", "25")), "4:").find("a list [x, ...]") != std::string::npos);
  CHECK(at(refused(with(gains, "[controller]", "[controller]\nfile = \"other.toml\"")), "3:").find("no place") !=
        std::string::npos);
  CHECK(at(refused(with(gains, "[estimator]", "[motor]")), "10:").find("no place in a gain file") != std::string::npos);
}

TEST_CASE("gain file: one that is not there is told of at the key that names it", "[scenario][gains]") {
  std::filesystem::remove(std::filesystem::path(SLIPBENCH_BINARY_DIR) / "gain_files" / "g.toml");
  const std::string text = scenario_text();
  try {
    read_scenario_text(text, "file.toml", (std::filesystem::path(SLIPBENCH_BINARY_DIR) / "gain_files").string());
    FAIL("was not refused");
  } catch (const InputError& error) {
    CHECK(error.key() == "controller.file");
    CHECK(error.place() == place_of(text, text.find("\"g.toml\"")));
    CHECK(error.code() == "file");
  }
}
