// Verbs, options and exit statuses of the command, each once: parsing, help, shell completion and the man page are written
// from these rows.
#pragma once

#include <span>
#include <string_view>
#include <vector>

namespace slipbench {

struct VerbRow {
  std::string_view name, meaning;
  std::string_view file;  // what FILE is
  std::vector<std::string_view> examples;
};

// What an option's value is made of: a name of a file, a number, one of a few words, a key of the scenario, or anything.
enum class Takes { text, file, number, word, key };

struct OptionRow {
  std::string_view name;
  std::string_view
      value;  // as help shows it; "" for a switch; "FILE.csv|FILE.h5": a file that ends so; "a|b": one of these words;
              // in brackets where it may be left out
  std::string_view verbs;  // that it means something for
  std::string_view meaning;
  Takes takes = Takes::text;
  bool replaces_file = false;  // stands in the place of FILE

  [[nodiscard]] bool for_verb(std::string_view verb) const;
  [[nodiscard]] bool value_may_be_left_out() const { return value.starts_with('['); }
  [[nodiscard]] std::vector<std::string_view> words() const;    // of Takes::word
  [[nodiscard]] std::vector<std::string_view> endings() const;  // of Takes::file: ".csv"
};

struct StatusRow {
  int status;
  std::string_view meaning;
};

std::span<const VerbRow> verb_rows();
std::span<const OptionRow> option_rows();   // that follow a verb
std::span<const OptionRow> program_rows();  // that stand in place of a verb
std::span<const StatusRow> status_rows();

inline constexpr std::string_view program_meaning =
    "a bench in software for induction-motor drives and their estimators";
inline constexpr std::string_view caution =
    "Caution: a simulation does not replace commissioning by qualified people under local codes.\n"
    "Inverters hold charge after switch-off and motors start without warning: isolate, discharge, verify, guard.";

}  // namespace slipbench
