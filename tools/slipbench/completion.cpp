#include "tools/slipbench/completion.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "sim/scenario/reference.hpp"
#include "tools/slipbench/command_table.hpp"

namespace slipbench {

namespace {

// A key as --set takes it, lists by their first element; keys of several kinds stand once.
struct SetKey {
  std::string name, meaning;
  std::vector<std::string> words;  // that it may hold, where they are few
};

std::vector<SetKey> set_keys() {
  std::vector<SetKey> keys;
  for (const SectionReference& section : scenario_reference()) {
    for (const KeyReference& row : section.keys) {
      const std::string name = first_element(row.key->path);
      const bool seen = std::any_of(keys.begin(), keys.end(), [&](const SetKey& key) { return key.name == name; });
      if (seen) continue;
      SetKey& key = keys.emplace_back(SetKey{name, std::string(row.key->meaning), {}});
      key.words.assign(row.key->words.begin(), row.key->words.end());
      if (row.holds == Holds::truth) key.words = {"true", "false"};
    }
  }
  return keys;
}

// `case` arms that hand out the words of each key that has some.
std::string word_arms(std::string_view command) {
  std::string arms;
  for (const SetKey& key : set_keys()) {
    if (!key.words.empty()) arms += fmt::format("    {}) {}{} ;;\n", key.name, command, fmt::join(key.words, " "));
  }
  return arms;
}

// Within single quotes of either shell.
std::string quoted(std::string_view text) {
  std::string out;
  for (const char c : text) out += c == '\'' ? "'\\''" : std::string(1, c);
  return out;
}

// Within the brackets of a specification of zsh's _arguments.
std::string bracketed(std::string_view text) {
  std::string out;
  for (const char c : text) {
    if (c == '[' || c == ']' || c == ':' || c == '\\') out += '\\';
    out += c;
  }
  return quoted(out);
}

std::string bash_value_arms(std::span<const OptionRow> rows) {
  std::string arms;
  for (const OptionRow& row : rows) {
    if (row.value.empty()) continue;
    arms += fmt::format("    {}) ", row.name);
    if (row.takes == Takes::key) {
      arms += "_slipbench_keys \"$cur\"; return ;;\n";
    } else if (row.takes == Takes::file) {
      arms += fmt::format("_slipbench_files \"$cur\" '*{}'; return ;;\n", fmt::join(row.endings(), "' '*"));
    } else if (row.takes == Takes::word) {
      arms += fmt::format("{}_slipbench_offer '{}' \"$cur\" && return ;;\n",
                          row.value_may_be_left_out() ? "[[ $cur != -* ]] && " : "", fmt::join(row.words(), " "));
    } else {
      arms += "return ;;\n";
    }
  }
  return arms;
}

// One specification of zsh's _arguments.
std::string zsh_spec(const OptionRow& row) {
  const std::string meaning = bracketed(row.meaning);
  if (row.value.empty()) return fmt::format("'{}[{}]'", row.name, meaning);
  std::string action = " ";
  if (row.takes == Takes::key) action = "_slipbench_set";
  if (row.takes == Takes::file) action = fmt::format("_files -g \"*{}\"", fmt::join(row.endings(), " *"));
  if (row.takes == Takes::word) action = fmt::format("({})", fmt::join(row.words(), " "));
  return fmt::format("'{}{}=[{}]{}{}:{}'", row.takes == Takes::key ? "*" : "", row.name, meaning,
                     row.value_may_be_left_out() ? "::" : ":", bracketed(row.value), action);
}

}  // namespace

std::string bash_completion() {
  std::string verbs, options, keys;
  for (const VerbRow& verb : verb_rows()) {
    verbs += fmt::format("{} ", verb.name);
    options += fmt::format("    {}) options='--help", verb.name);
    for (const OptionRow& row : option_rows()) {
      if (row.for_verb(verb.name)) options += fmt::format(" {}", row.name);
    }
    options += "' ;;\n";
  }
  for (const OptionRow& row : program_rows()) verbs += fmt::format("{} ", row.name);
  verbs.pop_back();
  for (const SetKey& key : set_keys()) keys += fmt::format("{}=\n", key.name);
  return "# Completion of slipbench for bash, written by: slipbench --completion bash\n"
         "_slipbench_offer() { mapfile -t COMPREPLY < <(compgen -W \"$1\" -- \"$2\"); }\n"
         "_slipbench_files() {\n"
         "  compopt -o filenames 2>/dev/null\n"
         "  local cur=$1 pattern\n"
         "  shift\n"
         "  mapfile -t COMPREPLY < <(compgen -d -- \"$cur\"\n"
         "    for pattern; do compgen -f -X \"!$pattern\" -- \"$cur\"; done)\n"
         "}\n"
         "_slipbench_keys() {\n"
         "  compopt -o nospace 2>/dev/null\n"
         "  _slipbench_offer '\n" +
         keys +
         "' \"$1\"\n"
         "}\n"
         "_slipbench_words() {\n"
         "  case $1 in\n" +
         word_arms("echo ") +
         "  esac\n"
         "}\n"
         "_slipbench() {\n"
         "  local cur=${COMP_WORDS[COMP_CWORD]} before=${COMP_WORDS[COMP_CWORD - 1]} verb=${COMP_WORDS[1]} options=''\n"
         "  COMPREPLY=()\n"
         "  # The shell breaks words at '=': --trace=FILE and --set KEY=VALUE are three words.\n"
         "  if [[ $cur == = ]]; then\n"
         "    cur=''\n"
         "  elif [[ $before == = ]]; then\n"
         "    before=${COMP_WORDS[COMP_CWORD - 2]}\n"
         "  elif ((COMP_CWORD == 1)); then\n"
         "    _slipbench_offer '" +
         verbs +
         "' \"$cur\"\n"
         "    return\n"
         "  elif [[ $before != -* ]]; then\n"
         "    before=''\n"
         "  fi\n"
         "  case $before in\n" +
         bash_value_arms(program_rows()) + bash_value_arms(option_rows()) +
         "    [a-z]*) _slipbench_offer \"$(_slipbench_words \"$before\")\" \"$cur\"; return ;;\n"
         "  esac\n"
         "  case $verb in\n" +
         options +
         "    *) return ;;\n"
         "  esac\n"
         "  if [[ $cur == -* ]]; then\n"
         "    _slipbench_offer \"$options\" \"$cur\"\n"
         "  else\n"
         "    _slipbench_files \"$cur\" '*.toml'\n"
         "  fi\n"
         "}\n"
         "complete -F _slipbench slipbench\n";
}

std::string zsh_completion() {
  std::string verbs, arms, programs, keys;
  for (const VerbRow& verb : verb_rows()) {
    verbs += fmt::format("    '{}:{}'\n", verb.name, quoted(verb.meaning));
    arms += fmt::format("    {})\n      _arguments '--help[help]' \\\n", verb.name);
    for (const OptionRow& row : option_rows()) {
      if (row.for_verb(verb.name)) arms += fmt::format("        {} \\\n", zsh_spec(row));
    }
    arms += fmt::format("        '1:{}:_files -g \"*.toml\"'\n      ;;\n", bracketed(verb.file));
  }
  for (const OptionRow& row : program_rows()) programs += fmt::format("    '(- *)'{} \\\n", zsh_spec(row));
  for (const SetKey& key : set_keys()) keys += fmt::format("    '{}:{}'\n", key.name, quoted(key.meaning));
  return "#compdef slipbench\n"
         "# Completion of slipbench for zsh, written by: slipbench --completion zsh\n"
         "_slipbench_set() {\n"
         "  if compset -P '*='; then\n"
         "    case ${${IPREFIX%=}##*=} in\n" +
         word_arms("compadd - ") +
         "    esac\n"
         "    return\n"
         "  fi\n"
         "  local -a keys=(\n" +
         keys +
         "  )\n"
         "  _describe -t keys 'scenario key' keys -S =\n"
         "}\n"
         "_slipbench_verbs() {\n"
         "  local -a verbs=(\n" +
         verbs +
         "  )\n"
         "  _describe -t verbs 'verb' verbs\n"
         "}\n"
         "_slipbench() {\n"
         "  local curcontext=$curcontext state line\n"
         "  typeset -A opt_args\n"
         "  _arguments -C \\\n" +
         programs +
         "    '1:verb:_slipbench_verbs' '*::argument:->of_verb'\n"
         "  [[ $state == of_verb ]] || return\n"
         "  case $line[1] in\n" +
         arms +
         "  esac\n"
         "}\n"
         "if [[ $funcstack[1] == _slipbench ]]; then _slipbench \"$@\"; else compdef _slipbench slipbench; fi\n";
}

}  // namespace slipbench
