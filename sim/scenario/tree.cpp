// The one unit that knows toml++: its nodes become ours, its errors InputErrors.
#include "sim/scenario/tree.hpp"

#define TOML_ENABLE_FORMATTERS 0
#include <toml++/toml.h>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <system_error>

namespace slipbench {
namespace {

// toml++ builds and frees dotted keys by recursion without a limit: measure the nesting before it sees the text. Strings
// and comments are skipped; where this reading and toml++'s could part, toml++ has met a syntax error already.
class NestingScan {
 public:
  explicit NestingScan(std::string_view text) : text_(text) {}

  // Offset of the first character that nests too deep, or npos.
  std::size_t too_deep() {
    int brackets = 0, dots = 0;
    for (at_ = 0; at_ < text_.size(); ++at_) {
      switch (text_[at_]) {
        case '#':
          skip_comment();
          dots = 0;
          break;
        case '"':
        case '\'':
          skip_string(text_[at_]);
          break;
        case '.':
          ++dots;
          break;
        case '[':
        case '{':
          ++brackets;
          dots = 0;
          break;
        case ']':
        case '}':
          brackets = std::max(brackets - 1, 0);
          dots = 0;
          break;
        case ',':
        case '=':
        case '\n':
          dots = 0;
          break;
        default:
          break;
      }
      if (brackets > deepest_nesting || dots > deepest_nesting) return at_;
    }
    return std::string_view::npos;
  }

 private:
  void skip_comment() { at_ = std::min(text_.find('\n', at_), text_.size()); }
  void skip_string(char quote) {
    const bool basic = quote == '"';
    if (text_.substr(at_, 3) == std::string(3, quote)) {
      for (at_ += 3; at_ < text_.size(); ++at_) {
        if (basic && text_[at_] == '\\')
          ++at_;
        else if (text_.substr(at_, 3) == std::string(3, quote))
          break;
      }
      at_ += 2;
      while (at_ + 1 < text_.size() && text_[at_ + 1] == quote) ++at_;  // up to two quotes may end the text itself
      return;
    }
    for (++at_; at_ < text_.size() && text_[at_] != quote && text_[at_] != '\n'; ++at_) {
      if (basic && text_[at_] == '\\') ++at_;
    }
  }

  std::string_view text_;
  std::size_t at_ = 0;
};

Place at(const toml::source_position& p, const std::shared_ptr<const std::string>& file) {
  return {file, static_cast<unsigned>(p.line), static_cast<unsigned>(p.column)};
}

bool earlier(const Place& a, const Place& b) { return a.line != b.line ? a.line < b.line : a.column < b.column; }

Node convert(const toml::node& from, const std::shared_ptr<const std::string>& file) {
  Node node;
  node.place = node.name_place = at(from.source().begin, file);
  if (const toml::table* table = from.as_table()) {
    node.kind = Node::Kind::table;
    for (const auto& [key, value] : *table) {
      Node child = convert(value, file);
      child.name = std::string(key.str());
      child.name_place = at(key.source().begin, file);
      node.children.push_back(std::move(child));
    }
    std::sort(node.children.begin(), node.children.end(),
              [](const Node& a, const Node& b) { return earlier(a.name_place, b.name_place); });
  } else if (const toml::array* array = from.as_array()) {
    node.kind = Node::Kind::array;
    node.children.reserve(array->size());
    for (const toml::node& value : *array) node.children.push_back(convert(value, file));
  } else if (const auto* text = from.as_string()) {
    node.kind = Node::Kind::text, node.text = text->get();
  } else if (const auto* whole = from.as_integer()) {
    node.kind = Node::Kind::whole, node.whole = whole->get();
  } else if (const auto* real = from.as_floating_point()) {
    node.kind = Node::Kind::real, node.real = real->get();
  } else if (const auto* truth = from.as_boolean()) {
    node.kind = Node::Kind::truth, node.truth = truth->get();
  } else {
    node.kind = Node::Kind::date;
  }
  return node;
}

void place_all(Node& node, const Place& place) {
  node.place = node.name_place = place;
  for (Node& child : node.children) place_all(child, place);
}

Place place_of_offset(std::string_view text, std::size_t offset, const std::string& name) {
  const std::string_view before = text.substr(0, offset);
  const auto line = static_cast<unsigned>(1 + std::count(before.begin(), before.end(), '\n'));
  const std::size_t start = before.rfind('\n');
  const std::size_t column = start == std::string_view::npos ? offset + 1 : offset - start;
  return {std::make_shared<const std::string>(name), line, static_cast<unsigned>(column)};
}

}  // namespace

Node parse_toml(std::string_view text, const std::string& name) {
  const std::size_t deep = NestingScan(text).too_deep();
  if (deep != std::string_view::npos) {
    throw InputError(place_of_offset(text, deep, name).text(), "",
                     "nested deeper than " + std::to_string(deepest_nesting) + " levels", "syntax");
  }
  const auto file = std::make_shared<const std::string>(name);
  try {
    return convert(toml::parse(text), file);
  } catch (const toml::parse_error& error) {
    Place place = at(error.source().begin, file);
    place.line = std::max(place.line, 1u), place.column = std::max(place.column, 1u);
    std::string what(error.description());
    throw InputError(place.text(), "", "not valid TOML: " + printable(what), "syntax");
  }
}

Node parse_value(std::string_view text, const Place& place) {
  Node value;
  value.kind = Node::Kind::text;
  value.text = std::string(text);
  try {
    Node root = parse_toml("value = " + std::string(text), "");
    if (root.children.size() == 1 && root.children.front().name == "value") value = std::move(root.children.front());
  } catch (const InputError&) {  // not TOML: a bare word, taken as a string
  }
  value.name.clear();
  place_all(value, place);
  return value;
}

std::optional<std::string> read_text(const std::string& path, std::string& why) {
  std::error_code error;
  const auto status = std::filesystem::status(path, error);
  if (path.empty() || path.find('\0') != std::string::npos || !std::filesystem::exists(status)) {
    const bool absent = !error || error == std::errc::no_such_file_or_directory || error == std::errc::not_a_directory;
    why = absent ? "there is no such file" : "cannot be read: " + error.message();
    return std::nullopt;
  }
  if (std::filesystem::is_directory(status)) return why = "is a folder, not a file", std::nullopt;
  std::ifstream stream(path, std::ios::binary);
  if (!stream) return why = "cannot be opened for reading", std::nullopt;
  std::string text(std::filesystem::is_regular_file(status) ? 0 : largest_file + 1, '\0');
  if (text.empty()) {
    const auto size = std::filesystem::file_size(path, error);
    text.resize(error || size > largest_file ? largest_file + 1 : static_cast<std::size_t>(size) + 1);
  }
  stream.read(text.data(), static_cast<std::streamsize>(text.size()));
  if (stream.bad()) return why = "cannot be read", std::nullopt;
  text.resize(static_cast<std::size_t>(stream.gcount()));
  if (text.size() > largest_file) return why = "is larger than 4 MiB", std::nullopt;
  if (text.empty()) return why = "is empty", std::nullopt;
  return text;
}

}  // namespace slipbench
