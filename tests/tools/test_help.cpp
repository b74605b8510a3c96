// Help, man page and completions: every verb and option of the one table is in each of them, and their requests are checked.
#include <catch2/catch.hpp>

#include "sim/scenario/reference.hpp"
#include "tools/slipbench/command_table.hpp"
#include "tools/slipbench/completion.hpp"
#include "tools/slipbench/man_page.hpp"
#include "tools/slipbench/options.hpp"

using namespace slipbench;
using Catch::Contains;

namespace {

std::string refusal(const std::vector<std::string>& arguments) {
  try {
    parse_command_line(arguments);
  } catch (const InputError& error) {
    CHECK(error.code() == "usage");
    return error.message();
  }
  FAIL("accepted");
  return "";
}

std::string roff(std::string_view text) {
  std::string out;
  for (const char c : text) out += c == '-' ? "\\-" : std::string(1, c);
  return out;
}

}  // namespace

TEST_CASE("help, man page, completions: every verb and option of the table", "[tools][contract]") {
  const std::string help = parse_command_line({"--help"}).text, man = man_page();
  const std::string bash = bash_completion(), zsh = zsh_completion();
  for (const VerbRow& verb : verb_rows()) {
    INFO(verb.name);
    const std::string name(verb.name), own = parse_command_line({name, "--help"}).text;
    CHECK_THAT(help, Contains("\n  " + name + " "));
    CHECK_THAT(man, Contains("\n\\fB" + name + "\\fR \\fIFILE\\fR\n"));
    CHECK_THAT(bash, Contains("    " + name + ") options="));
    CHECK_THAT(zsh, Contains("    '" + name + ":"));
    CHECK_FALSE(verb.examples.empty());
    for (const std::string_view example : verb.examples) {
      CHECK_THAT(own, Contains("\n  " + std::string(example) + "\n"));
      CHECK_THAT(help, Contains("\n  " + std::string(example) + "\n"));
      CHECK_THAT(man, Contains(roff(example)));
    }
    for (const OptionRow& option : option_rows()) {
      INFO(option.name);
      CHECK((own.find("\n  " + std::string(option.name) + " ") != std::string::npos) == option.for_verb(verb.name));
    }
  }
  for (const auto& rows : {option_rows(), program_rows()}) {
    for (const OptionRow& option : rows) {
      INFO(option.name);
      CHECK_THAT(man, Contains("\n\\fB" + roff(option.name) + "\\fR"));
      CHECK_THAT(bash, Contains(std::string(option.name)));
      CHECK_THAT(zsh, Contains(std::string(option.name)));
      CHECK_FALSE(option.meaning.empty());
      CHECK((option.takes == Takes::file) == option.value.starts_with("FILE."));
      if (option.takes == Takes::word) CHECK(option.words().size() > 1);
      if (option.takes == Takes::file) {
        for (const std::string_view ending : option.endings()) CHECK(ending.starts_with('.'));
      }
    }
  }
  for (const OptionRow& option : program_rows()) CHECK_THAT(help, Contains(std::string(option.name)));
}

TEST_CASE("completions: every scenario key, lists by their first element", "[tools][contract]") {
  const std::string bash = bash_completion(), zsh = zsh_completion();
  for (const Key& key : scenario_keys()) {
    CHECK_THAT(bash, Contains("\n" + first_element(key.path) + "=\n"));
    CHECK_THAT(zsh, Contains("\n    '" + first_element(key.path) + ":"));
  }
}

TEST_CASE("command line: what stands in place of a verb or of FILE", "[tools][contract]") {
  CHECK(parse_command_line({"--man"}).text == man_page());
  CHECK(parse_command_line({"--completion", "bash"}).text == bash_completion());
  CHECK(parse_command_line({"--completion=zsh"}).text == zsh_completion());
  CHECK_THAT(refusal({"--completion", "bsh"}), Contains("expected bash or zsh") && Contains("nearest is bash"));
  CHECK_THAT(refusal({"--completion"}), Contains("--completion needs a value"));
  CHECK_THAT(refusal({"--man", "run", "a.toml"}), Contains("--man stands alone"));
  CHECK_THAT(refusal({"--man", "--completion", "bash"}), Contains("stands alone"));
  CHECK_THAT(refusal({"--completion", "bash", "zsh"}), Contains("--completion stands alone"));
  CHECK_THAT(refusal({"--man", "a.toml"}), Contains("--man stands alone"));
  CHECK_THAT(refusal({"check", "--keys", "--schema"}), Contains("one of them at a time"));

  const auto keys = parse_command_line({"check", "--keys", "--json"});
  CHECK(keys.request->keys);
  CHECK(keys.request->wants_reference());
  CHECK(parse_command_line({"check", "--schema"}).request->schema == "scenario");
  CHECK(parse_command_line({"check", "--schema", "machine"}).request->schema == "machine");
  CHECK(parse_command_line({"check", "--schema=machine", "--quiet"}).request->schema == "machine");
  CHECK(parse_command_line({"check", "--schema", "--quiet"}).request->schema == "scenario");
  CHECK_FALSE(parse_command_line({"check", "a.toml"}).request->wants_reference());
  CHECK_THAT(refusal({"check"}), Contains("check needs a FILE"));
  CHECK_THAT(refusal({"check", "--keys", "a.toml"}), Contains("--keys") && Contains("leave out 'a.toml'"));
  CHECK_THAT(refusal({"check", "a.toml", "--schema"}), Contains("--schema") && Contains("leave out 'a.toml'"));
  CHECK_THAT(refusal({"check", "--schema", "a.toml"}), Contains("expected scenario or machine or system"));
  CHECK_THAT(refusal({"check", "--schema", "machin"}), Contains("nearest is machine"));
  CHECK_THAT(refusal({"check", "--markdown", "a.toml"}), Contains("--markdown goes with --keys"));
  CHECK_THAT(refusal({"check", "--keys", "--markdown", "--json"}), Contains("one form at a time"));
  CHECK_THAT(refusal({"check", "--schema", "--markdown"}), Contains("one form at a time"));
  CHECK_THAT(refusal({"check", "--keys", "--set", "seed=1"}), Contains("--set means nothing with --keys"));
  CHECK_THAT(refusal({"check", "--keys", "--seed", "1"}), Contains("--seed means nothing with --keys"));
  CHECK_THAT(refusal({"run", "a.toml", "--keys"}), Contains("--keys means nothing for run") && Contains("check"));
}
