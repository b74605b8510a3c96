#include "sim/scenario/overrides.hpp"

#include <algorithm>
#include <charconv>

#include "sim/scenario/fill.hpp"
#include "sim/scenario/keys.hpp"

namespace slipbench {
namespace {

bool as_index(std::string_view part, std::size_t& index) {
  const auto [end, error] = std::from_chars(part.data(), part.data() + part.size(), index);
  return error == std::errc() && end == part.data() + part.size();
}

Node made(std::string_view name, Node::Kind kind, const Place& place) {
  Node node;
  node.kind = kind, node.name = std::string(name);
  node.place = node.name_place = place;
  return node;
}

// The child of `node` called `part`, made where the file has none.
Node& step_into(Node& node, std::string_view part, const std::string& so_far, const Place& place,
                const std::string& key) {
  if (node.kind == Node::Kind::array) {
    std::size_t index = 0;
    if (!as_index(part, index) || index > node.children.size()) {
      const std::string count = std::to_string(node.children.size());
      refuse(place, key,
             "'" + printable(so_far) + "' is a list of " + count + ": '" + printable(part) +
                 "' is none of its elements, numbered from 0, nor the next one, " + count,
             "unknown_key");
    }
    if (index == node.children.size()) node.children.push_back(made("", Node::Kind::table, place));
    return node.children[index];
  }
  if (node.kind != Node::Kind::table) {
    refuse(place, key,
           "'" + printable(so_far) + "' is " + found_text(node) + "; it holds no key '" + printable(part) + "'",
           "unknown_key");
  }
  if (Node* child = node.child(part)) return *child;
  const bool list = find_section(row_path(so_far.empty() ? std::string(part) : so_far + "." + std::string(part)).path +
                                 "[]") != nullptr;
  node.children.push_back(made(part, list ? Node::Kind::array : Node::Kind::table, place));
  return node.children.back();
}

}  // namespace

void apply_overrides(Node& root, const std::vector<Override>& overrides, const std::string& before) {
  for (const Override& o : overrides) {
    const std::string shown = before + printable(o.key);
    const Place place{std::make_shared<const std::string>("--set:" + shown), 0, 0};
    if (o.key.empty() || o.key.front() == '.' || o.key.back() == '.' || o.key.find("..") != std::string::npos) {
      refuse(place, o.key, "'" + shown + "' is no dotted key, such as run.duration_s or estimator.0.kind",
             "unknown_key");
    }
    if (std::count(o.key.begin(), o.key.end(), '.') > deepest_nesting) {
      refuse(place, o.key, "'" + shown + "' is nested deeper than any key", "unknown_key");
    }
    Node* node = &root;
    std::string so_far;
    for (std::size_t start = 0; start <= o.key.size();) {
      const std::size_t dot = std::min(o.key.find('.', start), o.key.size());
      const std::string_view part = std::string_view(o.key).substr(start, dot - start);
      node = &step_into(*node, part, so_far, place, o.key);
      so_far = o.key.substr(0, dot);
      start = dot + 1;
    }
    Node value = parse_value(o.value, place);
    value.name = node->name;
    value.name_place = place;
    *node = std::move(value);
  }
}

}  // namespace slipbench
