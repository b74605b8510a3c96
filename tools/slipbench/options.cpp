#include "tools/slipbench/options.hpp"

#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <charconv>
#include <cmath>
#include <map>

#include "sim/record/trace.hpp"
#include "sim/scenario/nearest.hpp"
#include "sim/sweep/cluster.hpp"
#include "tools/slipbench/command_table.hpp"
#include "tools/slipbench/completion.hpp"
#include "tools/slipbench/man_page.hpp"

namespace slipbench {

namespace {

[[noreturn]] void refuse(std::string_view key, const std::string& message) {
  throw InputError("command line", std::string(key), message, "usage");
}

std::string listed(const std::vector<std::string_view>& names) { return fmt::format("{}", fmt::join(names, ", ")); }

template <class Whole>
Whole whole_number(std::string_view option, const std::string& text, Whole low, Whole high) {
  Whole value{};
  const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (error != std::errc{} || end != text.data() + text.size() || value < low || value > high) {
    refuse(option, fmt::format("{} '{}': expected a whole number from {} to {}", option, text, low, high));
  }
  return value;
}

double positive_number(std::string_view option, const std::string& text) {
  double value = 0.0;
  const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (error != std::errc{} || end != text.data() + text.size() || !(value > 0.0) || !std::isfinite(value)) {
    refuse(option, fmt::format("{} '{}': expected a number above 0, as in {} 1.0", option, text, option));
  }
  return value;
}

[[noreturn]] void refuse_verb(const std::string& word) {
  std::vector<std::string_view> names;
  for (const VerbRow& row : verb_rows()) names.push_back(row.name);
  refuse(word, fmt::format("unknown verb '{}'; there are {}; the nearest is '{}'", word, listed(names),
                           nearest(word, names)));
}

bool is_verb(std::string_view word) {
  return std::any_of(verb_rows().begin(), verb_rows().end(), [&](const VerbRow& row) { return row.name == word; });
}

[[noreturn]] void refuse_extra(const std::string& verb, const std::string& word) {
  if (!word.starts_with('-')) {
    refuse(word, fmt::format("'{}' is one argument too many: {} takes one FILE", word, verb));
  }
  const std::string name = word.substr(0, word.find('='));
  std::vector<std::string_view> known = {"--help"};
  for (const OptionRow& row : option_rows()) {
    if (row.name == name) {
      refuse(name, fmt::format("{} means nothing for {}; it belongs to: {}", name, verb, row.verbs));
    }
    if (row.for_verb(verb)) known.push_back(row.name);
  }
  refuse(name, fmt::format("unknown option '{}' of {}; the nearest is {}", name, verb, nearest(name, known)));
}

// LOW..HIGH, as in 1.0..2.5.
void read_band(const std::string& text, ClockBand& band) {
  const std::size_t dots = text.find("..");
  if (dots == std::string::npos)
    refuse("--clocks-per-instruction",
           fmt::format("--clocks-per-instruction '{}': expected LOW..HIGH, as in 1.0..2.5", text));
  band.least = positive_number("--clocks-per-instruction", text.substr(0, dots));
  band.most = positive_number("--clocks-per-instruction", text.substr(dots + 2));
  if (band.least > band.most)
    refuse("--clocks-per-instruction", fmt::format("--clocks-per-instruction '{}': LOW is above HIGH", text));
}

Shard shard_of(const std::string& text) {
  const std::size_t slash = text.find('/');
  if (slash == std::string::npos || text.find('/', slash + 1) != std::string::npos) {
    refuse("--shard", fmt::format("--shard '{}': expected I/N, as in 0/3 for the first of three", text));
  }
  Shard shard;
  shard.count = whole_number<std::uint64_t>("--shard", text.substr(slash + 1), 1, most_cases);
  shard.index = whole_number<std::uint64_t>("--shard", text.substr(0, slash), 0, most_cases);
  if (shard.index >= shard.count)
    refuse("--shard",
           fmt::format("--shard '{}': shards count from 0, so the last is {}/{}", text, shard.count - 1, shard.count));
  return shard;
}

void want_word(const OptionRow& row, const std::string& word) {
  const std::vector<std::string_view> words = row.words();
  if (std::count(words.begin(), words.end(), word) > 0) return;
  refuse(row.name, fmt::format("{} '{}': expected {}; the nearest is {}", row.name, word, fmt::join(words, " or "),
                               nearest(word, words)));
}

// --keys and --schema tell of the format itself: no file, and no change to one, goes with them.
void check_reference(const Request& r) {
  if (!r.wants_reference()) {
    if (r.markdown) refuse("--markdown", "--markdown goes with --keys: slipbench check --keys --markdown");
    return;
  }
  const std::string name = r.schema.empty() ? "--keys" : "--schema";
  if (!r.schema.empty()) {
    for (const OptionRow& row : option_rows()) {
      if (row.name == name) want_word(row, r.schema);
    }
  }
  if (!r.file.empty()) {
    refuse(name, fmt::format("{} tells what any file may hold and reads none: leave out '{}', or leave out {} to check "
                             "that file",
                             name, r.file, name));
  }
  if (!r.overrides.empty()) refuse("--set", fmt::format("--set means nothing with {}: no file is read", name));
  if (r.seed) refuse("--seed", fmt::format("--seed means nothing with {}: no file is read", name));
  if (r.keys && !r.schema.empty()) refuse("--schema", "--schema stands beside --keys: one of them at a time");
  if (r.markdown && (r.json || !r.schema.empty())) {
    refuse("--markdown", fmt::format("--markdown stands beside {}: one form at a time", r.json ? "--json" : name));
  }
}

// Options that mean something for a map alone.
void check_map(const Request& r, bool csv) {
  if (!r.map.empty()) {
    for (const bool given : {r.period_s > 0.0, r.at_Hz > 0.0}) {
      const char* name = given && r.period_s > 0.0 ? "--period" : "--at";
      if (given) refuse(name, fmt::format("{} means nothing with --map", name));
    }
    return;
  }
  const std::pair<const char*, bool> all[] = {{"--csv", csv},
                                              {"--model", !r.speed_model.empty()},
                                              {"--estimator", !r.estimator.empty()},
                                              {"--path", !r.path.empty()}};
  for (const auto& [name, given] : all) {
    if (given) refuse(name, fmt::format("{} needs --map beside it, as in --map speed_observability", name));
  }
}

// What was given for each option.
struct Given {
  std::string file;
  std::map<std::string_view, bool> flags;
  std::map<std::string_view, std::vector<std::string>> values;
};

Request request_of(const std::string& verb, Given& given) {
  Request r;
  r.verb = verb;
  r.file = given.file;
  r.json = given.flags["--json"], r.quiet = given.flags["--quiet"], r.progress = given.flags["--progress"];
  r.in_loop = given.flags["--in-loop"];
  const auto flag = [&](const char* name) {
    if (given.values[name].size() > 1) refuse(name, fmt::format("{} is given more than once", name));
    return !given.values[name].empty();
  };
  const auto text = [&](const char* name) { return flag(name) ? given.values[name].front() : std::string(); };
  r.trace = text("--trace"), r.figure = text("--figure"), r.figure_of = text("--figure-of");
  for (const char* name : {"--trace", "--figure"}) {
    if (flag(name) && text(name).empty()) refuse(name, fmt::format("{} needs the name of a file", name));
  }
  if (flag("--figure-of") && r.figure_of.empty()) refuse("--figure-of", "--figure-of needs the name of a figure");
  if (flag("--seed")) r.seed = whole_number<std::uint64_t>("--seed", text("--seed"), 0, UINT64_MAX);
  if (flag("--run")) r.noise_run = whole_number<std::uint32_t>("--run", text("--run"), 0, UINT32_MAX);
  if (flag("--runs")) r.runs = whole_number<std::uint32_t>("--runs", text("--runs"), 1, 1000000);
  r.store = text("--store"), r.csv = text("--csv"), r.isa = text("--isa");
  r.merge = given.values["--merge"];
  r.search = text("--search"), r.write = text("--write");
  if (flag("--budget")) r.budget = whole_number<std::uint32_t>("--budget", text("--budget"), 1, 1000000);
  for (const char* name : {"--budget", "--write"}) {
    if (flag(name) && !flag("--search") && verb == "sweep")
      refuse(name, fmt::format("{} needs --search FIGURE beside it", name));
  }
  for (const char* name : {"--store", "--csv", "--shard", "--merge"}) {
    if (flag("--search") && !given.values[name].empty())
      refuse(name, fmt::format("{} means nothing with --search: a search keeps no store", name));
  }
  if (flag("--write") && !r.write.ends_with(".toml") && !r.write.starts_with("/dev/"))
    refuse("--write", fmt::format("--write '{}': expected a name that ends in .toml", r.write));
  if (flag("--on")) {
    for (const OptionRow& row : option_rows()) {
      if (row.name == "--on") want_word(row, text("--on"));
    }
    r.on_slurm = text("--on") == "slurm";
  }
  if (flag("--shards")) r.shards = whole_number<std::uint64_t>("--shards", text("--shards"), 1, 1000000);
  for (const std::string& option : given.values["--slurm"]) r.slurm.push_back(pass_option(option));
  for (const char* name : {"--shards", "--slurm"}) {
    if (!r.on_slurm && !given.values[name].empty()) refuse(name, fmt::format("{} needs --on slurm beside it", name));
  }
  for (const char* name : {"--shard", "--merge", "--search"}) {
    if (r.on_slurm && !given.values[name].empty())
      refuse(name, fmt::format("{} does not go with --on slurm, which cuts and joins the shards itself", name));
  }
  r.estimator = verb == "export" ? "" : text("--estimator");
  r.estimators = given.values["--estimator"];
  r.export_controller = given.flags["--controller"], r.cost = given.flags["--cost"];
  if (flag("--precision")) {
    for (const OptionRow& row : option_rows()) {
      if (row.name == "--precision") want_word(row, text("--precision"));
    }
    r.double_precision = text("--precision") == "double";
  }
  if (flag("--to")) r.to = text("--to");
  if (r.to.empty()) refuse("--to", "--to needs the name of a folder");
  for (const char* name : {"--clock-mhz", "--clocks-per-instruction"}) {
    if (flag(name) && !r.cost) refuse(name, fmt::format("{} needs --cost beside it", name));
  }
  if (flag("--clock-mhz")) r.band.clock_MHz = positive_number("--clock-mhz", text("--clock-mhz"));
  if (flag("--clocks-per-instruction")) read_band(text("--clocks-per-instruction"), r.band);
  if (flag("--case")) r.plan_case = whole_number<std::uint64_t>("--case", text("--case"), 0, most_cases);
  if (flag("--shard")) r.shard = shard_of(text("--shard"));
  if (flag("--threads")) r.threads = whole_number<unsigned>("--threads", text("--threads"), 1, 1024);
  if (flag("--publish")) r.publish = text("--publish");
  if (flag("--publish-wait"))
    r.publish_wait = whole_number<unsigned>("--publish-wait", text("--publish-wait"), 1, 1024);
  if (r.publish_wait > 0 && !r.publish) refuse("--publish-wait", "--publish-wait needs --publish ENDPOINT beside it");
  r.lock_step = given.flags["--lock-step"], r.link = text("--link"), r.record = text("--record");
  if (flag("--watchdog")) r.watchdog = whole_number<unsigned>("--watchdog", text("--watchdog"), 1, 1000000);
  if (flag("--answer-within"))
    r.answer_within_ms = whole_number<unsigned>("--answer-within", text("--answer-within"), 1, 60000);
  if (verb == "board" && !r.lock_step)
    refuse("--lock-step", "board runs in lock-step only so far: say --lock-step, so that a paced run may come later");
  if (verb == "board" && r.link.empty())
    refuse("--link", "board needs --link: pipe:COMMAND, unix:PATH, serial:DEVICE, host, emulated or emulated_uart");
  if (flag("--record") && !r.record.ends_with(".frames") && !r.record.starts_with("/dev/"))
    refuse("--record", fmt::format("--record '{}': expected a name that ends in .frames", r.record));
  if (flag("--pace")) r.pace = positive_number("--pace", text("--pace"));
  if (flag("--period")) r.period_s = positive_number("--period", text("--period"));
  if (flag("--at")) r.at_Hz = positive_number("--at", text("--at"));
  r.map = text("--map"), r.speed_model = text("--model"), r.path = text("--path");
  for (const OptionRow& row : option_rows()) {
    if ((row.name == "--map" || row.name == "--model") && flag(row.name.data())) want_word(row, text(row.name.data()));
  }
  if (verb == "analyse") check_map(r, flag("--csv"));
  for (const std::string& setting : given.values["--set"]) {
    const std::size_t equals = setting.find('=');
    if (equals == std::string::npos || equals == 0) {
      refuse("--set", fmt::format("--set '{}': expected KEY=VALUE, as in run.duration_s=2.0", setting));
    }
    r.overrides.push_back({setting.substr(0, equals), setting.substr(equals + 1)});
  }
  if (!r.trace.empty() && !r.trace.ends_with(".csv") && !is_hdf5_name(r.trace) && !r.trace.starts_with("/dev/")) {
    refuse("--trace", fmt::format("--trace '{}': the file's ending tells the format; expected .csv or .h5", r.trace));
  }
  if (!r.figure.empty() && !r.figure.ends_with(".svg") && !r.figure.starts_with("/dev/")) {
    refuse("--figure", fmt::format("--figure '{}': expected a name that ends in .svg", r.figure));
  }
  r.keys = given.flags["--keys"], r.markdown = given.flags["--markdown"];
  if (flag("--schema")) r.schema = text("--schema").empty() ? "scenario" : text("--schema");
  check_reference(r);
  if (r.file.empty() && !r.wants_reference()) {
    refuse("FILE", fmt::format("{} needs a FILE, as in: slipbench {} demo.toml", verb, verb));
  }
  return r;
}

// The part of help, and of parsing, that belongs to one verb.
void add_verb(CLI::App& app, const VerbRow& verb, Given& given) {
  CLI::App* sub = app.add_subcommand(std::string(verb.name), std::string(verb.meaning));
  sub->allow_extras();
  sub->add_option("FILE", given.file, std::string(verb.file))->type_name("");
  for (const OptionRow& row : option_rows()) {
    if (!row.for_verb(verb.name)) continue;
    if (row.value.empty()) {
      sub->add_flag(std::string(row.name), given.flags[row.name], std::string(row.meaning));
    } else {  // one value each time it is given, so that FILE may follow
      sub->add_option(std::string(row.name), given.values[row.name], std::string(row.meaning))
          ->type_name("")
          ->option_text(std::string(row.value))
          ->type_size(row.value_may_be_left_out() ? 0 : 1, 1)
          ->allow_extra_args(false);
    }
  }
  const char* heading = verb.examples.size() > 1 ? "Examples" : "Example";
  sub->footer(fmt::format("{}:\n  {}\n\n{}", heading, fmt::join(verb.examples, "\n  "), caution));
}

[[noreturn]] void refuse_company(const std::string& name) {
  refuse(name, fmt::format("{} stands alone, as in: slipbench {}{}", name, name, name == "--man" ? "" : " bash"));
}

// What stands in place of a verb: the text it asks for.
std::optional<std::string> program_text(Given& given, const std::string& verb) {
  const std::vector<std::string>& shells = given.values["--completion"];
  const bool man = given.flags["--man"];
  if (shells.empty() && !man) return {};
  const std::string name = man ? "--man" : "--completion";
  if (!verb.empty() || shells.size() + (man ? 1 : 0) > 1) refuse_company(name);
  if (man) return man_page();
  for (const OptionRow& row : program_rows()) {
    if (row.name == name) want_word(row, shells.front());
  }
  return shells.front() == "zsh" ? zsh_completion() : bash_completion();
}

std::string verb_wanted() {
  std::vector<std::string_view> names;
  for (const VerbRow& row : verb_rows()) names.push_back(row.name);
  return fmt::format("a verb is needed: {}; `slipbench --help` tells more", listed(names));
}

}  // namespace

CommandLine parse_command_line(const std::vector<std::string>& arguments) {
  CLI::App app(fmt::format("slipbench: {}", program_meaning), "slipbench");
  Given given;
  for (const OptionRow& row : program_rows()) {
    const std::string name(row.name), meaning(row.meaning);
    if (name == "--help") {
      app.set_help_flag("-h,--help", meaning);
    } else if (name == "--version") {
      app.set_version_flag(name, std::string("slipbench ") + SLIPBENCH_VERSION, meaning);
    } else if (row.value.empty()) {
      app.add_flag(name, given.flags[row.name], meaning);
    } else {
      app.add_option(name, given.values[row.name], meaning)
          ->type_name("")
          ->option_text(std::string(row.value))
          ->allow_extra_args(false);
    }
  }
  std::string footer = "Examples:\n";
  for (const VerbRow& verb : verb_rows()) {
    add_verb(app, verb, given);
    for (const std::string_view example : verb.examples) footer += fmt::format("  {}\n", example);
  }
  app.footer(fmt::format("{}\n{}", footer, caution));

  if (arguments.empty()) refuse("VERB", verb_wanted());
  if (const std::string& first = arguments.front(); !first.starts_with('-') && !is_verb(first)) {
    refuse_verb(first);
  }
  try {
    std::vector<std::string> reversed(arguments.rbegin(), arguments.rend());  // CLI11 takes them from the back
    app.parse(std::move(reversed));
  } catch (const CLI::CallForHelp&) {
    return {{}, app.help()};
  } catch (const CLI::CallForVersion& version) {
    return {{}, std::string(version.what()) + "\n"};
  } catch (const CLI::ExtrasError&) {
    if (const std::string& first = arguments.front(); first == "--man" || first.starts_with("--completion")) {
      refuse_company(first.substr(0, first.find('=')));
    }
    refuse(arguments.front(),
           fmt::format("'{}' in front of the verb; the order is: slipbench VERB FILE [options]", arguments.front()));
  } catch (const CLI::ArgumentMismatch& error) {
    const std::string text = error.what(), name = text.substr(0, text.find(':'));
    refuse(name, fmt::format("{} needs a value", name));
  } catch (const CLI::ParseError& error) {
    refuse("", error.what());
  }
  const auto chosen = app.get_subcommands();
  if (auto text = program_text(given, chosen.empty() ? "" : chosen.front()->get_name())) return {{}, std::move(*text)};
  if (chosen.empty()) refuse("VERB", verb_wanted());
  CLI::App& sub = *chosen.front();
  if (const auto extras = app.remaining(true); !extras.empty()) refuse_extra(sub.get_name(), extras.front());
  return {request_of(sub.get_name(), given), ""};
}

}  // namespace slipbench
