#include "tools/slipbench/man_page.hpp"

#include <fmt/format.h>

#include "tools/slipbench/command_table.hpp"

namespace slipbench {

namespace {

// Text as typed on a command line: hyphens and quotes stay what they are.
std::string typed(std::string_view text) {
  std::string out;
  for (const char c : text) {
    switch (c) {
      case '\\':
        out += "\\e";
        break;
      case '-':
        out += "\\-";
        break;
      case '\'':
        out += "\\(aq";
        break;
      case '"':
        out += "\\(dq";
        break;
      case '`':
        out += "\\(ga";
        break;
      case '^':
        out += "\\(ha";
        break;
      case '~':
        out += "\\(ti";
        break;
      default:
        out += c;
    }
  }
  return out;
}

// A sentence; words in backquotes are typed, and stand out.
std::string prose(std::string_view text) {
  std::string out;
  while (!text.empty()) {
    const std::size_t open = text.find('`');
    const std::size_t close = open == std::string_view::npos ? open : text.find('`', open + 1);
    out += typed(text.substr(0, close == std::string_view::npos ? close : open));
    if (close == std::string_view::npos) break;
    out += "\\fB" + typed(text.substr(open + 1, close - open - 1)) + "\\fR";
    text.remove_prefix(close + 1);
  }
  if (out.starts_with('.')) out.insert(0, "\\&");  // else a macro
  return out;
}

std::string capital(std::string_view text) {
  std::string out(text);
  if (!out.empty() && out[0] >= 'a' && out[0] <= 'z') out[0] = static_cast<char>(out[0] - 'a' + 'A');
  return out;
}

std::string bold(std::string_view text) { return "\\fB" + typed(text) + "\\fR"; }

// "--trace FILE.csv", the name bold, the value as it stands or slanted.
std::string option_head(const OptionRow& row) {
  if (row.value.empty()) return bold(row.name);
  const std::string value = row.takes == Takes::word ? typed(row.value) : "\\fI" + typed(row.value) + "\\fR";
  return bold(row.name) + " " + value;
}

std::string section(std::string_view name) { return fmt::format(".SH \"{}\"\n", name); }
std::string entry(const std::string& head, const std::string& body) { return ".TP\n" + head + "\n" + body + "\n"; }

std::string synopsis() {
  std::string out = section("SYNOPSIS");
  for (const VerbRow& verb : verb_rows()) {
    out += fmt::format("{} {} \\fIFILE\\fR [\\fIoption\\fR ...]\n.br\n", bold("slipbench"), bold(verb.name));
    for (const OptionRow& row : option_rows()) {
      if (!row.replaces_file || !row.for_verb(verb.name)) continue;
      out += fmt::format("{} {} {} [\\fIoption\\fR ...]\n.br\n", bold("slipbench"), bold(verb.name), option_head(row));
    }
  }
  for (const OptionRow& row : program_rows()) out += fmt::format("{} {}\n.br\n", bold("slipbench"), option_head(row));
  return out;
}

std::string options() {
  std::string out = section("OPTIONS");
  for (const OptionRow& row : option_rows()) {
    std::string verbs(row.verbs);
    for (std::size_t at = verbs.find(' '); at != std::string::npos; at = verbs.find(' ', at + 2)) {
      verbs.replace(at, 1, ", ");
    }
    out += entry(option_head(row), fmt::format("{}. For: {}.", prose(capital(row.meaning)), typed(verbs)));
  }
  for (const OptionRow& row : program_rows()) out += entry(option_head(row), prose(capital(row.meaning)) + ".");
  return out;
}

}  // namespace

std::string man_page() {
  std::string out = fmt::format(
      ".\\\" Written by: slipbench \\-\\-man\n.TH SLIPBENCH 1 \"\" \"slipbench {}\" \"User Commands\"\n.nh\n.ad l\n",
      SLIPBENCH_VERSION);
  out += section("NAME") + "slipbench \\- " + typed(program_meaning) + "\n";
  out += synopsis();
  out +=
      section("DESCRIPTION") +
      "Simulates a drive with an induction motor from a scenario file (machine, inverter or mains, shaft, load, "
      "sensors,\n"
      "control), lets speed and flux estimators ride along or close the loop, and tells what each estimate was worth.\n"
      ".PP\n"
      "One file and one seed give one result, to the bit. Without further options a summary goes to standard output;\n"
      "messages and progress go to standard error.\n";
  out += section("VERBS");
  for (const VerbRow& verb : verb_rows()) {
    out += entry(fmt::format("{} \\fIFILE\\fR", bold(verb.name)),
                 fmt::format("{}. \\fIFILE\\fR: {}.", prose(capital(verb.meaning)), typed(verb.file)));
  }
  out += options();
  out += section("SCENARIO KEYS") + "Scenario and machine files are TOML. " + bold("slipbench check --keys") +
         " lists every key with what it may hold, its\n"
         "unit, default and meaning, one line a key; " +
         bold("slipbench check --schema") + " gives the same to an editor. With " + bold("--set") +
         "\n"
         "an element of a list is named by its number, from 0: " +
         bold("estimator.0.kind=luenberger") + ".\n";
  out += section("EXIT STATUS");
  for (const StatusRow& row : status_rows())
    out += entry(bold(std::to_string(row.status)), prose(capital(row.meaning)) + ".");
  out += section("EXAMPLES") + ".nf\n";
  for (const VerbRow& verb : verb_rows()) {
    for (const std::string_view example : verb.examples) out += typed(example) + "\n";
  }
  out += ".fi\n";
  out += section("CAUTIONS") + prose(capital(caution.substr(caution.find(' ') + 1))) + "\n";
  out += section("FILES");
  out += entry("\\fIscenario\\fR.toml", "A file with [run]: a drive and what is asked of it.");
  out += entry("\\fImachine\\fR.toml",
               "A file with [machine] alone: equivalent circuit and nameplate; scenarios name it.");
  for (const OptionRow& row : option_rows()) {
    if (row.takes != Takes::file) continue;
    for (const std::string_view ending : row.endings())
      out += entry("\\fIname\\fR" + typed(ending), fmt::format("Written by {}.", bold(row.name)));
  }
  return out;
}

}  // namespace slipbench
