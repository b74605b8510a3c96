#include "tools/slipbench/options.hpp"

#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <charconv>
#include <cmath>
#include <map>

#include "sim/scenario/nearest.hpp"

namespace slipbench {

namespace {

constexpr std::string_view caution =
    "Caution: a simulation does not replace commissioning by qualified people under local codes.\n"
    "Inverters hold charge after switch-off and motors start without warning: isolate, discharge, verify, guard.";

struct VerbRow {
  std::string_view name, meaning, example;
};
constexpr std::array<VerbRow, 3> verb_rows = {{
    {"run", "simulate a scenario once and print the summary",
     "slipbench run configs/scenarios/conveyor_hot_rotor.toml --set belief.rotor_resistance=1.5 --figure run.svg"},
    {"check", "read and validate a scenario or machine file, run nothing",
     "slipbench check configs/scenarios/hoist_lowering.toml --set run.plant_step_s=5e-6"},
    {"compare", "judge all estimators of a scenario over paired noise runs",
     "slipbench compare configs/scenarios/conveyor_hot_rotor.toml --runs 50 --in-loop --figure compare.svg"},
}};

// Every option once: the verbs it means something for, and whether it takes a value.
struct OptionRow {
  std::string_view name, value, verbs, meaning;
};
constexpr std::array<OptionRow, 14> option_rows = {{
    {"--set", "KEY=VALUE", "run check compare", "set a key of the file, dotted; VALUE is TOML or text; repeatable"},
    {"--seed", "N", "run check compare", "seed of every noise; wins over the file and --set"},
    {"--run", "R", "run", "take noise run R, as `compare` numbers them from 0"},
    {"--runs", "N", "compare", "noise runs (20)"},
    {"--in-loop", "", "compare", "each estimator closes the speed loop in turn, instead of all riding along"},
    {"--threads", "N", "compare", "threads (all cores); the results do not depend on it"},
    {"--trace", "FILE.csv", "run", "write the trace"},
    {"--figure", "FILE.svg", "run compare", "draw the result"},
    {"--publish", "ENDPOINT", "run", "publish the run as it happens: tcp://HOST:PORT, ipc://PATH or PORT (loopback)"},
    {"--publish-wait", "N", "run", "start when N subscribers are there"},
    {"--pace", "FACTOR", "run", "run no faster than FACTOR times real time"},
    {"--json", "", "run check compare", "one JSON document on standard output, nothing else"},
    {"--quiet", "", "run check compare", "print nothing but errors"},
    {"--progress", "", "run compare", "show progress on standard error even if it is no terminal"},
}};

bool means_something(const OptionRow& option, std::string_view verb) {
  return (" " + std::string(option.verbs) + " ").find(" " + std::string(verb) + " ") != std::string::npos;
}

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
  for (const VerbRow& row : verb_rows) names.push_back(row.name);
  refuse(word, fmt::format("unknown verb '{}'; there are {}; the nearest is '{}'", word, listed(names),
                           nearest(word, names)));
}

bool is_verb(std::string_view word) {
  return std::any_of(verb_rows.begin(), verb_rows.end(), [&](const VerbRow& row) { return row.name == word; });
}

[[noreturn]] void refuse_extra(const std::string& verb, const std::string& word) {
  if (!word.starts_with('-')) {
    refuse(word, fmt::format("'{}' is one argument too many: {} takes one FILE", word, verb));
  }
  const std::string name = word.substr(0, word.find('='));
  std::vector<std::string_view> known = {"--help"};
  for (const OptionRow& row : option_rows) {
    if (row.name == name) {
      refuse(name, fmt::format("{} means nothing for {}; it belongs to: {}", name, verb, row.verbs));
    }
    if (means_something(row, verb)) known.push_back(row.name);
  }
  refuse(name, fmt::format("unknown option '{}' of {}; the nearest is {}", name, verb, nearest(name, known)));
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
  r.trace = text("--trace"), r.figure = text("--figure");
  for (const char* name : {"--trace", "--figure"}) {
    if (flag(name) && text(name).empty()) refuse(name, fmt::format("{} needs the name of a file", name));
  }
  if (flag("--seed")) r.seed = whole_number<std::uint64_t>("--seed", text("--seed"), 0, UINT64_MAX);
  if (flag("--run")) r.noise_run = whole_number<std::uint32_t>("--run", text("--run"), 0, UINT32_MAX);
  if (flag("--runs")) r.runs = whole_number<std::uint32_t>("--runs", text("--runs"), 1, 1000000);
  if (flag("--threads")) r.threads = whole_number<unsigned>("--threads", text("--threads"), 1, 1024);
  if (flag("--publish")) r.publish = text("--publish");
  if (flag("--publish-wait"))
    r.publish_wait = whole_number<unsigned>("--publish-wait", text("--publish-wait"), 1, 1024);
  if (r.publish_wait > 0 && !r.publish) refuse("--publish-wait", "--publish-wait needs --publish ENDPOINT beside it");
  if (flag("--pace")) r.pace = positive_number("--pace", text("--pace"));
  for (const std::string& setting : given.values["--set"]) {
    const std::size_t equals = setting.find('=');
    if (equals == std::string::npos || equals == 0) {
      refuse("--set", fmt::format("--set '{}': expected KEY=VALUE, as in run.duration_s=2.0", setting));
    }
    r.overrides.push_back({setting.substr(0, equals), setting.substr(equals + 1)});
  }
  if (r.trace.ends_with(".h5") || r.trace.ends_with(".hdf5")) {
    refuse("--trace", "--trace: HDF5 is not written by this version; name a CSV file, as in --trace run.csv");
  }
  if (!r.trace.empty() && !r.trace.ends_with(".csv") && !r.trace.starts_with("/dev/")) {
    refuse("--trace", fmt::format("--trace '{}': the file's ending tells the format; expected .csv", r.trace));
  }
  if (!r.figure.empty() && !r.figure.ends_with(".svg") && !r.figure.starts_with("/dev/")) {
    refuse("--figure", fmt::format("--figure '{}': expected a name that ends in .svg", r.figure));
  }
  if (r.file.empty()) refuse("FILE", fmt::format("{} needs a FILE, as in: slipbench {} demo.toml", verb, verb));
  return r;
}

}  // namespace

CommandLine parse_command_line(const std::vector<std::string>& arguments) {
  CLI::App app("slipbench: a bench in software for induction-motor drives and their estimators", "slipbench");
  app.set_version_flag("--version", std::string("slipbench ") + SLIPBENCH_VERSION, "print the version");
  Given given;
  std::string footer = "Examples:\n";
  for (const VerbRow& verb : verb_rows) {
    CLI::App* sub = app.add_subcommand(std::string(verb.name), std::string(verb.meaning));
    sub->allow_extras();
    sub->add_option("FILE", given.file, verb.name == "check" ? "scenario or machine file" : "scenario file")
        ->type_name("");
    for (const OptionRow& row : option_rows) {
      if (!means_something(row, verb.name)) continue;
      if (row.value.empty()) {
        sub->add_flag(std::string(row.name), given.flags[row.name], std::string(row.meaning));
      } else {  // one value each time it is given, so that FILE may follow
        sub->add_option(std::string(row.name), given.values[row.name], std::string(row.meaning))
            ->type_name("")
            ->option_text(std::string(row.value))
            ->type_size(1)
            ->allow_extra_args(false);
      }
    }
    sub->footer(fmt::format("Example:\n  {}\n\n{}", verb.example, caution));
    footer += fmt::format("  {}\n", verb.example);
  }
  app.footer(fmt::format("{}\n{}", footer, caution));

  if (arguments.empty()) refuse("VERB", "a verb is needed: run, check or compare; `slipbench --help` tells more");
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
    refuse(arguments.front(),
           fmt::format("'{}' in front of the verb; the order is: slipbench VERB FILE [options]", arguments.front()));
  } catch (const CLI::ArgumentMismatch& error) {
    const std::string text = error.what(), name = text.substr(0, text.find(':'));
    refuse(name, fmt::format("{} needs a value", name));
  } catch (const CLI::ParseError& error) {
    refuse("", error.what());
  }
  const auto chosen = app.get_subcommands();
  if (chosen.empty()) refuse("VERB", "a verb is needed: run, check or compare; `slipbench --help` tells more");
  CLI::App& sub = *chosen.front();
  if (const auto extras = app.remaining(true); !extras.empty()) refuse_extra(sub.get_name(), extras.front());
  return {request_of(sub.get_name(), given), ""};
}

}  // namespace slipbench
