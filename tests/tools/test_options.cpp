// The command line: what is understood, what is refused and how.
#include <catch2/catch.hpp>
#include <filesystem>

#include "tools/slipbench/options.hpp"

using namespace slipbench;

namespace {

std::string refusal(const std::vector<std::string>& arguments) {
  try {
    parse_command_line(arguments);
  } catch (const InputError& error) {
    CHECK(error.place() == "command line");
    CHECK(error.code() == "usage");
    return error.message();
  }
  FAIL("accepted");
  return "";
}

}  // namespace

TEST_CASE("command line: verb, file and options in any order after the verb", "[tools][contract]") {
  const auto line =
      parse_command_line({"run", "--set", "run.duration_s=1.0", "a.toml", "--seed", "18446744073709551615", "--set",
                          "load.0.torque_Nm=[[0, 0], [1, 2]]", "--json", "--trace=t.csv", "--set=title=a=b"});
  REQUIRE(line.request);
  CHECK(line.request->verb == "run");
  CHECK(line.request->file == "a.toml");
  CHECK(*line.request->seed == 18446744073709551615u);
  CHECK(line.request->json);
  CHECK(line.request->trace == "t.csv");
  REQUIRE(line.request->overrides.size() == 3);
  CHECK(line.request->overrides[1].key == "load.0.torque_Nm");
  CHECK(line.request->overrides[1].value == "[[0, 0], [1, 2]]");
  CHECK(line.request->overrides[2].value == "a=b");
  const auto compare = parse_command_line({"compare", "a.toml", "--runs", "7", "--in-loop", "--threads", "3"});
  CHECK(compare.request->runs == 7);
  CHECK(compare.request->in_loop);
  CHECK(compare.request->threads == 3);
  CHECK_FALSE(compare.request->seed);
}

TEST_CASE("command line: a board needs a link, and says how it is driven", "[tools][contract]") {
  using Catch::Contains;
  const auto line = parse_command_line({"board", "a.toml", "--lock-step", "--link", "pipe:./b --x", "--watchdog", "7",
                                        "--answer-within", "20", "--record", "r.frames"});
  REQUIRE(line.request);
  CHECK((line.request->lock_step && line.request->link == "pipe:./b --x" && line.request->record == "r.frames"));
  CHECK((line.request->watchdog == 7 && line.request->answer_within_ms == 20));
  CHECK_THAT(refusal({"board", "a.toml", "--link", "host"}), Contains("--lock-step"));
  CHECK_THAT(refusal({"board", "a.toml", "--lock-step"}), Contains("needs --link"));
  CHECK_THAT(refusal({"board", "a.toml", "--lock-step", "--link", "host", "--watchdog", "0"}), Contains("from 1"));
  CHECK_THAT(refusal({"board", "a.toml", "--lock-step", "--link", "host", "--answer-within", "x"}),
             Contains("--answer-within"));
  CHECK_THAT(refusal({"board", "a.toml", "--lock-step", "--link", "host", "--record", "r.csv"}), Contains(".frames"));
  CHECK_THAT(refusal({"run", "a.toml", "--link", "host"}), Contains("--link means nothing for run"));
}

TEST_CASE("command line: what export is told", "[tools][contract]") {
  const auto line = parse_command_line({"export", "a.toml", "--estimator", "x", "--estimator", "y", "--controller",
                                        "--precision", "double", "--to", "there"});
  CHECK(line.request->estimators == std::vector<std::string>{"x", "y"});
  CHECK(line.request->export_controller);
  CHECK(line.request->double_precision);
  CHECK(line.request->to == "there");
  const auto cost =
      parse_command_line({"export", "a.toml", "--cost", "--clock-mhz", "168", "--clocks-per-instruction", "1.2..2"});
  CHECK(cost.request->cost);
  CHECK(cost.request->band.clock_MHz == 168.0);
  CHECK(cost.request->band.least == 1.2);
  CHECK(cost.request->band.most == 2.0);
  CHECK(cost.request->band.least_us(1680) == Approx(12.0));
  CHECK_THAT(refusal({"export", "a.toml", "--clock-mhz", "168"}), Catch::Contains("needs --cost"));
  CHECK_THAT(refusal({"export", "a.toml", "--cost", "--clocks-per-instruction", "3..2"}),
             Catch::Contains("LOW is above HIGH"));
  CHECK_THAT(refusal({"run", "a.toml", "--cost"}), Catch::Contains("it belongs to: export"));
}

TEST_CASE("command line: help shows an example and the cautions for every verb", "[tools][contract]") {
  for (const std::string verb : {"run", "check", "compare"}) {
    const std::string text = parse_command_line({verb, "--help"}).text;
    CHECK_THAT(text, Catch::Contains(":\n  slipbench " + verb + " "));
    const std::size_t file = text.find("configs/scenarios/");  // the example can be typed as it stands, from the root
    REQUIRE(file != std::string::npos);
    CHECK(std::filesystem::exists(SLIPBENCH_SOURCE_DIR "/" + text.substr(file, text.find(' ', file) - file)));
    CHECK_THAT(text, Catch::Contains("Caution: a simulation does not replace commissioning by qualified people"));
  }
  CHECK_THAT(parse_command_line({"--help"}).text, Catch::Contains("slipbench compare "));
  CHECK_THAT(parse_command_line({"--version"}).text, Catch::StartsWith("slipbench "));
}

TEST_CASE("command line: mistakes are named, with the nearest known word", "[tools][edge]") {
  using Catch::Contains;
  CHECK_THAT(refusal({}), Contains("a verb is needed"));
  CHECK_THAT(refusal({"rnu", "a.toml"}),
             Contains("unknown verb 'rnu'") && Contains("run, check, compare") && Contains("nearest is 'run'"));
  CHECK_THAT(refusal({"--json", "run", "a.toml"}), Contains("in front of the verb"));
  CHECK_THAT(refusal({"run"}), Contains("needs a FILE"));
  CHECK_THAT(refusal({"run", ""}), Contains("needs a FILE"));
  CHECK_THAT(refusal({"run", "a.toml", "b.toml"}), Contains("'b.toml' is one argument too many"));
  CHECK_THAT(refusal({"run", "a.toml", "--sead", "1"}),
             Contains("unknown option '--sead'") && Contains("nearest is --seed"));
  CHECK_THAT(refusal({"run", "--runs", "20", "a.toml"}), Contains("--runs means nothing for run"));
  CHECK_THAT(refusal({"check", "a.toml", "--trace", "x.csv"}), Contains("--trace means nothing for check"));
  CHECK_THAT(refusal({"compare", "a.toml", "--trace", "x.csv"}), Contains("--trace means nothing for compare"));
  CHECK_THAT(refusal({"run", "a.toml", "--seed"}), Contains("--seed needs a value"));
  CHECK_THAT(refusal({"run", "a.toml", "--seed", "1", "--seed", "2"}), Contains("more than once"));
  for (const std::string bad : {"-1", "1.5", "x", "18446744073709551616", ""}) {
    CHECK_THAT(refusal({"run", "a.toml", "--seed=" + bad}), Contains("--seed"));
  }
  CHECK_THAT(refusal({"compare", "a.toml", "--runs", "0"}), Contains("whole number from 1"));
  CHECK_THAT(refusal({"run", "a.toml", "--set", "noequals"}), Contains("KEY=VALUE"));
  CHECK_THAT(refusal({"run", "a.toml", "--set", "=3"}), Contains("KEY=VALUE"));
  CHECK_THAT(refusal({"run", "a.toml", "--trace", "x.dat"}), Contains(".csv") && Contains(".h5"));
  CHECK_THAT(refusal({"run", "a.toml", "--trace", "x.txt"}), Contains(".csv"));
  CHECK_THAT(refusal({"run", "a.toml", "--trace", ""}), Contains("name of a file"));
  CHECK_THAT(refusal({"run", "a.toml", "--figure", "x.png"}), Contains(".svg"));
}
