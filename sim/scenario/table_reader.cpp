#include "sim/scenario/table_reader.hpp"

#include <algorithm>
#include <cmath>

#include "sim/scenario/fill.hpp"
#include "sim/scenario/nearest.hpp"

namespace slipbench {

TableReader::TableReader(const Node& node, std::string shown, std::vector<std::string_view> known)
    : node_(node), shown_(std::move(shown)), known_(std::move(known)) {
  if (node.kind != Node::Kind::table)
    refuse(node.place, shown_, "'" + shown_ + "' is " + found_text(node) + "; wanted is a table", "type");
  for (const Node& child : node.children) {
    if (std::count(known_.begin(), known_.end(), child.name) > 0) continue;
    refuse(child.name_place, dotted(child.name),
           "unknown key '" + printable(dotted(child.name)) + "'; the nearest known key is '" +
               dotted(nearest(child.name, known_)) + "'",
           "unknown_key");
  }
}

std::string TableReader::dotted(std::string_view name) const {
  return shown_.empty() ? std::string(name) : shown_ + "." + std::string(name);
}

void TableReader::wrong(const Node& at, std::string_view name, const std::string& wanted, const char* code) const {
  refuse(at.place, dotted(name), "'" + dotted(name) + "' is " + found_text(at) + "; wanted is " + wanted, code);
}

const Node& TableReader::need(std::string_view name, const std::string& wanted) const {
  if (const Node* found = child(name)) return *found;
  refuse(node_.place, dotted(name), "missing key '" + dotted(name) + "'; wanted is " + wanted, "missing");
}

double TableReader::number(std::string_view name) const {
  const Node& at = need(name, "a number");
  if (!at.is_number() || !std::isfinite(at.number())) wrong(at, name, "a finite number");
  return at.number();
}

std::uint64_t TableReader::whole(std::string_view name, std::uint64_t low, std::uint64_t high) const {
  const std::string wanted = "a whole number from " + std::to_string(low) + " to " + std::to_string(high);
  const Node& at = need(name, wanted);
  if (at.kind != Node::Kind::whole || at.whole < 0 || static_cast<std::uint64_t>(at.whole) < low ||
      static_cast<std::uint64_t>(at.whole) > high) {
    wrong(at, name, wanted);
  }
  return static_cast<std::uint64_t>(at.whole);
}

std::string TableReader::word(std::string_view name, const std::vector<std::string_view>& words) const {
  std::string list;
  for (const std::string_view w : words) list += (list.empty() ? "one of " : ", ") + std::string(w);
  const Node& at = need(name, words.empty() ? "a string" : list);
  if (at.kind != Node::Kind::text) wrong(at, name, words.empty() ? "a string" : list);
  if (!words.empty() && std::count(words.begin(), words.end(), at.text) == 0)
    wrong(at, name, list + "; nearest is " + std::string(nearest(at.text, words)));
  return at.text;
}

}  // namespace slipbench
