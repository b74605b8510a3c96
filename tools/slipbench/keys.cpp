// check --keys: the table of keys as a person reads it, in lines or in Markdown.
#include <fmt/format.h>

#include "sim/scenario/reference.hpp"
#include "tools/slipbench/keys_out.hpp"
#include "tools/slipbench/table.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

constexpr std::string_view about =
    "load[].kind stands for load.0.kind, load.1.kind, ...: lists of tables count from 0. A key that goes with a kind "
    "is known\n"
    "with that kind alone. What is numeric may vary in a sweep; what is structural fixes what runs, or how often.\n";

std::string about_section(const Section& section) {
  std::string text(section.meaning);
  if (section.need == Need::required) text += "; required";
  if (!section.rest_from.empty()) {
    text +=
        fmt::format("; what is missing here may come from the file that {}.{} names", section.path, section.rest_from);
  }
  return text;
}

// "fan", "circuit = t": where the key belongs.
std::string goes_with(const Section& section, const Key& key) {
  if (key.when.empty()) return "";
  return fmt::format("{} = {}", section.selector, fmt::join(key.when, " | "));
}

std::string_view nature(const Key& key) { return key.numeric() ? "numeric" : "structural"; }

std::string keys_text() {
  std::string text(about);
  for (const SectionReference& rows : scenario_reference()) {
    if (rows.keys.empty()) continue;
    Table table;
    for (const char* heading : {"key", "may hold", "unit", "default", "goes with", "sort", "meaning"}) {
      table.column(heading, "", Table::Align::left);
    }
    for (const KeyReference& row : rows.keys) {
      table.row({row.key->path, row.allowed_text(), std::string(row.key->unit), row.default_text(),
                 goes_with(*rows.section, *row.key), std::string(nature(*row.key)), std::string(row.key->meaning)});
    }
    const std::string head = rows.head();
    text += fmt::format("\n{}{}{}\n{}", head, head.empty() ? "" : "  ", about_section(*rows.section), table.text());
  }
  return text;
}

// Within a cell, where | parts cells.
std::string cell(std::string_view text) {
  std::string out;
  for (const char c : text) out += c == '|' ? "\\|" : std::string(1, c);
  return out;
}

std::string keys_markdown() {
  std::string text(about);
  for (const SectionReference& rows : scenario_reference()) {
    if (rows.keys.empty()) continue;
    const std::string head = rows.head();
    text += fmt::format("\n### {}\n\n{}.\n\n", head.empty() ? "Top of the file" : "`" + head + "`",
                        about_section(*rows.section));
    text += "| key | may hold | unit | default | goes with | sort | meaning |\n|---|---|---|---|---|---|---|\n";
    for (const KeyReference& row : rows.keys) {
      text += fmt::format("| `{}` | `{}` | {} | {} | {} | {} | {} |\n", row.key->path, cell(row.allowed_text()),
                          cell(row.key->unit), cell(row.default_text()), cell(goes_with(*rows.section, *row.key)),
                          nature(*row.key), cell(row.key->meaning));
    }
  }
  return text;
}

}  // namespace

int print_reference(const Request& request) {
  if (request.quiet) return ExitStatus::done;
  if (!request.schema.empty()) {
    print(request.schema == "machine"  ? machine_schema()
          : request.schema == "system" ? system_schema()
                                       : scenario_schema());
  } else if (request.json) {
    print(keys_document());
  } else {
    print(request.markdown ? keys_markdown() : keys_text());
  }
  return ExitStatus::done;
}

}  // namespace slipbench
