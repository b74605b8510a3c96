#include "sim/scenario/gain_file.hpp"

#include <algorithm>

#include "sim/scenario/fill.hpp"
#include "sim/scenario/values.hpp"
#include "sim/scenario/write.hpp"

namespace slipbench {
namespace {

constexpr std::string_view tables[] = {"controller", "estimator"};

bool is_head(std::string_view name) { return std::count(gain_file_heads.begin(), gain_file_heads.end(), name) > 0; }
bool is_table(std::string_view name) { return std::count(std::begin(tables), std::end(tables), name) > 0; }

// What may stand beside the tables.
void check_heads(const Node& root) {
  for (const Node& child : root.children) {
    if (child.name == "format") {
      Scenario nowhere;
      store(nowhere, *find_key(nowhere, "format"), 0, child, "format");
    } else if (is_head(child.name)) {
      if (child.kind != Node::Kind::text)
        refuse(child.place, child.name, "'" + child.name + "' is " + found_text(child) + "; wanted is a string",
               "type");
    } else if (!is_table(child.name)) {
      refuse(child.name_place, child.name,
             "'" + printable(child.name) +
                 "' has no place in a gain file: it holds [controller] or [estimator], and format, title, source",
             "unknown_key");
    }
  }
}

const Node& gains_of(const Node& root, const std::string& name) {
  check_heads(root);
  const Node* table = root.child(name);
  if (table == nullptr)
    refuse({root.place.file, 1, 1}, name, "missing table [" + name + "]: this gain file holds no gains for it",
           "missing");
  if (table->kind != Node::Kind::table)
    refuse(table->place, name, "'" + name + "' is " + found_text(*table) + "; wanted is a table", "type");
  for (const Node& child : table->children) {
    if (child.name != "file" && child.name != "kind" && child.name != "name") continue;
    refuse(child.name_place, name + "." + child.name,
           "'" + name + "." + child.name + "' has no place in a gain file: the scenario says it", "unknown_key");
  }
  return *table;
}

// Shortest text that reads back the same, always a real number in TOML.
std::string real_text(double x) {
  const std::string text = number_text(x);
  return text.find_first_of(".en") == std::string::npos ? text + ".0" : text;
}

std::string row_text(const SettingTable& t, std::size_t n, std::size_t row) {
  std::string out;
  for (std::size_t column = 0; column < t.columns; ++column)
    out += (column == 0 ? "" : ", ") + real_text(t(n, row, column));
  return "[" + out + "]";
}

std::string table_text(const SettingTable& t) {
  std::string out = "[";
  const bool list = t.rows == 1 && t.columns == 1;
  for (std::size_t n = 0; n < t.count; ++n) {
    if (list) {
      out += (n == 0 ? "" : ", ") + real_text(t(n));
      continue;
    }
    out += "\n  [";
    for (std::size_t row = 0; row < t.rows; ++row) out += (row == 0 ? "" : ",\n   ") + row_text(t, n, row);
    out += "],";
  }
  return out + (list ? "]" : "\n]");
}

std::string section_text(const std::string& name, const Settings& settings) {
  std::vector<std::string> lines;
  for (const auto& [key, value] : settings.given()) {
    const bool choice = key == "integral_action";
    lines.push_back(key + " = " + (choice ? value > 0.5 ? "true" : "false" : real_text(value)) + "\n");
  }
  std::sort(lines.begin(), lines.end());
  for (const char* key : {"gain_frequency_Hz", "K", "K_integral", "reference_gain", "L"}) {
    if (const SettingTable* table = settings.table(key))
      lines.push_back(std::string(key) + " = " + table_text(*table) + "\n");
  }
  std::string out = "\n[" + name + "]\n";
  for (const std::string& line : lines) out += line;
  return lines.empty() ? "" : out;
}

}  // namespace

std::string gain_file_text(const GainFile& gains) {
  std::string out;
  for (const auto& [name, value] : gains.made_for) out += "# " + name + ": " + value + "\n";
  out += "format = 1\n";
  if (!gains.title.empty()) {
    Node root, title;
    title.kind = Node::Kind::text, title.name = "title", title.text = gains.title;
    root.children.push_back(title);
    out += toml_text(root);
  }
  return out + section_text("controller", gains.controller) + section_text("estimator", gains.estimator);
}

bool is_gain_file(const Node& root) {
  bool tables = false;
  for (const Node& child : root.children) {
    if (!is_head(child.name) && !is_table(child.name)) return false;
    tables = tables || (is_table(child.name) && child.kind == Node::Kind::table && child.child("kind") == nullptr);
  }
  return tables;
}

void merge_gains(Node& into, const Node& file, const std::string& table) {
  for (const Node& child : gains_of(file, table).children) {
    if (into.child(child.name) == nullptr) into.children.push_back(child);
  }
}

void check_gain_file(const Node& root) {
  check_heads(root);
  const auto check = [&](const std::string& table, const std::string& section, const std::string& kind) {
    if (root.child(table) == nullptr) return;
    Node filled = gains_of(root, table);
    const auto say = [&](const char* key, const std::string& word) {
      Node node;
      node.kind = Node::Kind::text, node.name = key, node.text = word;
      node.place = node.name_place = filled.place;
      filled.children.push_back(node);
    };
    say("kind", kind);
    if (table == "estimator") say("name", "observer");
    Scenario alone;
    alone.estimators.resize(1);
    fill_section(alone, filled, section, table);
  };
  check("controller", "controller", "state_feedback");
  check("estimator", "estimator[]", "linear_observer");
}

}  // namespace slipbench
