// Files: what kind they are, where their machine files lie, and the way through parsing, overrides, filling and checks.
#include "sim/scenario/read.hpp"

#include <algorithm>
#include <filesystem>
#include <map>
#include <utility>

#include "sim/scenario/check.hpp"
#include "sim/scenario/fill.hpp"
#include "sim/scenario/gain_file.hpp"
#include "sim/scenario/overrides.hpp"
#include "sim/scenario/tree.hpp"
#include "sim/scenario/values.hpp"

namespace slipbench {

struct ParsedScenario {
  std::string path, folder;
  Node root;
  std::map<std::string, Node> named;  // machine and gain files named in it, as they parsed when it was opened
};

namespace {

Node parse_file(const std::string& path) {
  std::string why;
  const auto text = read_text(path, why);
  if (!text) throw InputError(path, "", why, "file");
  return parse_toml(*text, path);
}

std::string beside(const std::string& folder, const std::string& file) {
  return (std::filesystem::path(folder) / file).lexically_normal().string();
}

FileKind kind_of(const Node& root) {
  if (root.child("system") != nullptr) return FileKind::system;
  const Node* plan = root.child("scenario");
  if (plan != nullptr && plan->kind == Node::Kind::text) return FileKind::plan;
  if (root.child("run") != nullptr) return FileKind::scenario;
  const Node* machine = root.child("machine");
  bool alone = machine != nullptr;
  for (const Node& child : root.children) {
    const bool head = std::count(machine_file_heads.begin(), machine_file_heads.end(), child.name) > 0;
    alone = alone && (head || child.name == "machine");
  }
  if (alone) return FileKind::machine;
  if (is_gain_file(root)) return FileKind::gains;
  // A scenario that lacks [run] is still meant as one: let its reader name the missing key.
  for (const Node& child : root.children) {
    if (find_section(child.name) != nullptr || find_section(child.name + "[]") != nullptr) return FileKind::scenario;
  }
  refuse({root.place.file, 1, 1}, "",
         "no table that tells what this file is: a scenario holds [run], a machine file [machine] alone, a plan "
         "scenario = \"...\", a system [system]",
         "file");
}

void want_kind(const Node& root, FileKind wanted) {
  const FileKind kind = kind_of(root);
  if (kind == wanted) return;
  const auto name = [](FileKind k) {
    return k == FileKind::scenario  ? "a scenario"
           : k == FileKind::machine ? "a machine file"
           : k == FileKind::plan    ? "a sweep plan"
           : k == FileKind::gains   ? "a gain file"
                                    : "a state-space system";
  };
  refuse({root.place.file, 1, 1}, "", std::string("this is ") + name(kind) + "; wanted is " + name(wanted), "file");
}

// The [machine] of a machine file; nothing else may stand beside it but format, title and source.
const Node& machine_table(const Node& root) {
  for (const Node& child : root.children) {
    if (child.name == "format") {
      Scenario nowhere;
      store(nowhere, *find_key(nowhere, "format"), 0, child, "format");
    } else if (std::count(machine_file_heads.begin(), machine_file_heads.end(), child.name) > 0) {
      if (child.kind != Node::Kind::text)
        refuse(child.place, child.name, "'" + child.name + "' is " + found_text(child) + "; wanted is a string",
               "type");
    } else if (child.name != "machine") {
      refuse(child.name_place, child.name,
             "'" + printable(child.name) +
                 "' has no place in a machine file: it holds [machine] alone, and format, title, source",
             "unknown_key");
    }
  }
  const Node* table = root.child("machine");
  if (table == nullptr)
    refuse({root.place.file, 1, 1}, "machine", "missing table [machine]: this is no machine file", "missing");
  if (const Node* file = table->child("file")) {
    refuse(file->name_place, "machine.file", "'machine.file' has no place in a machine file: it names no other",
           "unknown_key");
  }
  return *table;
}

// The machine or gain file that a key names; what stops it from being read is told at that key, what is wrong in it there.
Node load_named(const ParsedScenario& parsed, const Node& key, const std::string& dotted) {
  const std::string path = beside(parsed.folder, key.text);
  const auto known = parsed.named.find(path);
  if (known != parsed.named.end()) return known->second;
  std::string why = "there is no such file";
  const auto text = key.text.empty() ? std::nullopt : read_text(path, why);
  if (!text) refuse(key.place, dotted, "'" + dotted + "' names \"" + printable(path) + "\": " + why, "file");
  return parse_toml(*text, path);
}

void merge_machine(Node& root, const ParsedScenario& parsed) {
  Node* machine = root.child("machine");
  const Node* file = machine == nullptr ? nullptr : machine->child("file");
  if (file == nullptr || machine->kind != Node::Kind::table || file->kind != Node::Kind::text) return;
  const Node other = load_named(parsed, *file, "machine.file");
  const Node& table = machine_table(other);
  if (table.kind != Node::Kind::table)
    refuse(table.place, "machine", "'machine' is " + found_text(table) + "; wanted is a table", "type");
  for (const Node& child : table.children) {
    if (machine->child(child.name) == nullptr) machine->children.push_back(child);
  }
}

// Gain files of the controller and of estimators.
void merge_gain_files(Node& root, const ParsedScenario& parsed) {
  const auto merge = [&](Node& table, const std::string& dotted, const std::string& name) {
    if (table.kind != Node::Kind::table) return;
    const Node* file = table.child("file");
    if (file != nullptr && file->kind == Node::Kind::text) merge_gains(table, load_named(parsed, *file, dotted), name);
  };
  if (Node* controller = root.child("controller")) merge(*controller, "controller.file", "controller");
  Node* estimators = root.child("estimator");
  if (estimators == nullptr || estimators->kind != Node::Kind::array) return;
  for (std::size_t i = 0; i < estimators->children.size(); ++i)
    merge(estimators->children[i], "estimator." + std::to_string(i) + ".file", "estimator");
}

MachineSettings machine_of(const Node& root, const std::string& from) {
  Scenario alone;
  fill_section(alone, machine_table(root), "machine", "machine");
  check_machine(alone.machine, root, "machine");
  alone.machine.rated_torque_Nm = alone.machine.nameplate().torque_Nm;
  alone.machine.file = from;
  if (const Node* title = root.child("title")) alone.machine.title = title->text;
  if (const Node* source = root.child("source")) alone.machine.source = source->text;
  return alone.machine;
}

// Parses the machine and gain files a scenario names ahead of its readings. Failures wait for the reading that needs the file.
void preload(ParsedScenario& parsed, const std::vector<std::string>& more = {}) {
  const auto take = [&](const Node& key, const char* dotted) {
    if (key.kind != Node::Kind::text) return;
    try {
      Node file = load_named(parsed, key, dotted);
      parsed.named.emplace(beside(parsed.folder, key.text), std::move(file));
    } catch (const InputError&) {
    }
  };
  for (const char* dotted : {"machine.file", "belief.file", "controller.file"}) {
    if (const Node* key = find(parsed.root, dotted)) take(*key, dotted);
  }
  if (const Node* estimators = parsed.root.child("estimator")) {
    for (const Node& estimator : estimators->children) {
      if (const Node* key = estimator.child("file")) take(*key, "estimator.file");
    }
  }
  for (const std::string& text : more) take(parse_value(text, parsed.root.place), "machine.file");
}

}  // namespace

ScenarioFile::ScenarioFile(const std::string& path, const std::vector<std::string>& machines) {
  auto parsed = std::make_shared<ParsedScenario>();
  parsed->path = path;
  parsed->folder = std::filesystem::path(path).parent_path().string();
  parsed->root = parse_file(path);
  want_kind(parsed->root, FileKind::scenario);
  preload(*parsed, machines);
  parsed_ = std::move(parsed);
}

ScenarioFile::ScenarioFile(const std::string& text, const std::string& name, const std::string& folder) {
  auto parsed = std::make_shared<ParsedScenario>();
  parsed->folder = folder;
  if (text.size() > largest_file) throw InputError(name, "", "it is larger than 4 MiB", "file");
  parsed->root = parse_toml(text, name);
  want_kind(parsed->root, FileKind::scenario);
  preload(*parsed);
  parsed_ = std::move(parsed);
}

Scenario ScenarioFile::read(const std::vector<Override>& overrides, std::optional<std::uint64_t> seed) const {
  Node root = parsed_->root;
  apply_overrides(root, overrides);
  merge_machine(root, *parsed_);
  merge_gain_files(root, *parsed_);
  Scenario scenario;
  scenario.path = parsed_->path;
  fill(scenario, root);
  if (seed) scenario.seed = *seed;
  if (const Node* file = find(root, "belief.file")) {
    scenario.belief.machine = machine_of(load_named(*parsed_, *file, "belief.file"), file->text);
    scenario.belief.has_machine = true;
  }
  derive_defaults(scenario, root);
  check_relations(scenario, root);
  return scenario;
}

std::vector<std::string> ScenarioFile::machine_files() const {
  std::vector<std::string> paths;
  for (const auto& [path, node] : parsed_->named) paths.push_back(path);
  return paths;
}

FileKind kind_of_file(const std::string& path) { return kind_of(parse_file(path)); }

Scenario read_scenario(const std::string& path, const std::vector<Override>& overrides,
                       std::optional<std::uint64_t> seed) {
  return ScenarioFile(path).read(overrides, seed);
}

Scenario read_scenario_text(const std::string& text, const std::string& name, const std::string& folder,
                            const std::vector<Override>& overrides) {
  return ScenarioFile(text, name, folder).read(overrides);
}

std::string read_gain_file(const std::string& path, const std::vector<Override>& overrides) {
  Node root = parse_file(path);
  want_kind(root, FileKind::gains);
  apply_overrides(root, overrides);
  check_gain_file(root);
  const Node* title = root.child("title");
  return title == nullptr ? "" : title->text;
}

MachineSettings read_machine(const std::string& path, const std::vector<Override>& overrides) {
  Node root = parse_file(path);
  want_kind(root, FileKind::machine);
  apply_overrides(root, overrides);
  return machine_of(root, path);
}

}  // namespace slipbench
