#include "sim/scenario/fill.hpp"

#include <algorithm>
#include <cmath>

#include "sim/scenario/nearest.hpp"
#include "sim/scenario/values.hpp"

namespace slipbench {
namespace {

constexpr std::size_t longest_list = 256;

std::string joined(const std::string& shown, std::string_view name) {
  return shown.empty() ? std::string(name) : shown + "." + std::string(name);
}

std::string listed(const std::vector<std::string_view>& words) {
  std::string list;
  for (const std::string_view word : words) list += (list.empty() ? "" : ", ") + std::string(word);
  return list;
}

// The word that decides which rows of a table belong; read first, so that it is known before the rest.
std::string selector_word(Scenario& scenario, const Node& table, const Section& section, const std::string& shown,
                          std::size_t index) {
  if (section.selector.empty()) return {};
  const std::string path = joined(std::string(section.path), section.selector);
  for (const Key& key : scenario_keys()) {
    if (key.path != path) continue;
    const std::string dotted = joined(shown, section.selector);
    if (const Node* node = table.child(section.selector)) {
      store(scenario, key, index, *node, dotted);
    } else if (key.need == Need::required) {
      refuse(table.name_place, dotted, "missing key '" + dotted + "'; wanted is " + key.allowed(), "missing");
    }
    return std::get<std::string& (*)(Scenario&, std::size_t)>(key.slot)(scenario, index);
  }
  return {};
}

bool belongs(const Key& key, const std::string& word) {
  return key.when.empty() || std::count(key.when.begin(), key.when.end(), word) > 0;
}

class Filler {
 public:
  explicit Filler(Scenario& scenario) : scenario_(scenario) {}

  void table(const Node& node, const Section& section, const std::string& shown, std::size_t index) {
    if (node.kind != Node::Kind::table) {
      refuse(node.place, shown, "'" + shown + "' is " + found_text(node) + "; wanted is a table, [" + shown + "]",
             "type");
    }
    const std::string word = selector_word(scenario_, node, section, shown, index);
    for (const Node& child : node.children) {
      const std::string path = joined(std::string(section.path), child.name);
      const std::string dotted = joined(shown, child.name);
      if (const Section* inner = find_section(path)) {
        if (inner->enter != nullptr) inner->enter(scenario_, 1);
        table(child, *inner, dotted, 0);
      } else if (const Section* list = find_section(path + "[]")) {
        tables(child, *list, dotted);
      } else if (child.name != section.selector || section.selector.empty()) {
        value(child, section, path, shown, dotted, word, index);
      }
    }
    for (const Key& key : scenario_keys()) {
      if (key.need != Need::required || key.section() != section.path || !belongs(key, word)) continue;
      if (node.child(key.name()) == nullptr) missing(node, joined(shown, key.name()), key);
    }
  }

  void required_tables(const Node& root) {
    for (const Section& section : scenario_sections()) {
      if (section.need != Need::required || root.child(section.path) != nullptr) continue;
      const std::string name(section.path);
      refuse({root.place.file, 1, 1}, name, "missing table [" + name + "]: " + std::string(section.meaning), "missing");
    }
  }

 private:
  void tables(const Node& node, const Section& list, const std::string& shown) {
    if (node.kind != Node::Kind::array) {
      refuse(node.place, shown,
             "'" + shown + "' is " + found_text(node) + "; wanted is a list of tables, [[" + shown + "]]", "type");
    }
    if (node.children.size() > longest_list) {
      refuse(
          node.place, shown,
          "'" + shown + "' is " + found_text(node) + "; wanted are at most " + std::to_string(longest_list) + " tables",
          "range");
    }
    list.enter(scenario_, node.children.size());
    for (std::size_t i = 0; i < node.children.size(); ++i) {
      table(node.children[i], list, shown + "." + std::to_string(i), i);
    }
  }

  void value(const Node& child, const Section& section, const std::string& path, const std::string& shown,
             const std::string& dotted, const std::string& word, std::size_t index) {
    std::vector<std::string_view> elsewhere;
    for (const Key& key : scenario_keys()) {
      if (key.path != path) continue;
      if (belongs(key, word)) return store(scenario_, key, index, child, dotted);
      elsewhere.insert(elsewhere.end(), key.when.begin(), key.when.end());
    }
    if (elsewhere.empty()) refuse_unknown(child.name_place, section.path, shown, child.name);
    refuse(child.name_place, dotted,
           "'" + dotted + "' does not go with " + std::string(section.selector) + " = \"" + printable(word) +
               "\", only with " + listed(elsewhere),
           "unknown_key");
  }

  [[noreturn]] static void missing(const Node& table, const std::string& dotted, const Key& key) {
    refuse(table.name_place, dotted,
           "missing key '" + dotted + "' (" + std::string(key.meaning) + "); wanted is " + key.allowed(), "missing");
  }

  Scenario& scenario_;
};

}  // namespace

void refuse(const Place& place, const std::string& key, const std::string& message, const std::string& code) {
  throw InputError(place.text(), printable(key), message, code);
}

void refuse_unknown(const Place& place, std::string_view section, const std::string& shown, std::string_view typed) {
  std::string best;
  std::size_t least = static_cast<std::size_t>(-1);
  const auto offer = [&](std::size_t distance, const std::string& full) {
    if (distance < least) least = distance, best = full;
  };
  // A name of the same table is nearer than the same name elsewhere by a little: both slips happen.
  constexpr std::size_t elsewhere = 3;
  for (const Key& key : scenario_keys()) {
    const bool here = key.section() == section;
    offer(name_distance(typed, key.name()) + (here ? 0 : elsewhere), here ? joined(shown, key.name()) : key.path);
  }
  for (const Section& other : scenario_sections()) {
    if (other.path.empty()) continue;
    std::string_view name = other.path;
    if (other.is_list()) name.remove_suffix(2);
    const std::size_t dot = name.rfind('.');
    const std::string_view last = name.substr(dot == std::string_view::npos ? 0 : dot + 1);
    const bool here = (dot == std::string_view::npos ? std::string_view() : name.substr(0, dot)) == section;
    offer(name_distance(typed, last) + (here ? 0 : elsewhere), std::string(name));
  }
  const std::string dotted = joined(shown, typed);
  refuse(place, dotted, "unknown key '" + printable(dotted) + "'; the nearest known key is '" + best + "'",
         "unknown_key");
}

void fill(Scenario& scenario, const Node& root) {
  Filler filler(scenario);
  filler.required_tables(root);
  filler.table(root, *find_section(""), "", 0);
}

void fill_section(Scenario& scenario, const Node& table, std::string_view section, const std::string& shown) {
  Filler(scenario).table(table, *find_section(section), shown, 0);
}

}  // namespace slipbench
