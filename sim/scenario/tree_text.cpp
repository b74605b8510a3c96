// Nodes as a person reads them, and the way to a dotted key.
#include <array>
#include <charconv>
#include <utility>

#include "sim/scenario/tree.hpp"

namespace slipbench {

std::string Place::text() const {
  std::string out = file ? *file : std::string();
  if (line > 0) out += ":" + std::to_string(line) + ":" + std::to_string(column);
  return out;
}

const Node* Node::child(std::string_view key) const {
  for (const Node& node : children) {
    if (node.name == key) return &node;
  }
  return nullptr;
}

Node* Node::child(std::string_view key) { return const_cast<Node*>(std::as_const(*this).child(key)); }

const Node* find(const Node& root, std::string_view dotted) {
  const Node* node = &root;
  while (node != nullptr && !dotted.empty()) {
    const std::size_t dot = dotted.find('.');
    const std::string_view part = dotted.substr(0, dot);
    dotted = dot == std::string_view::npos ? std::string_view() : dotted.substr(dot + 1);
    if (node->kind == Node::Kind::array) {
      std::size_t index = 0;
      const auto [end, error] = std::from_chars(part.data(), part.data() + part.size(), index);
      const bool good = error == std::errc() && end == part.data() + part.size() && index < node->children.size();
      node = good ? &node->children[index] : nullptr;
    } else {
      node = node->child(part);
    }
  }
  return node;
}

std::string number_text(double value) {
  std::array<char, 32> digits{};
  const auto [end, error] = std::to_chars(digits.data(), digits.data() + digits.size(), value);
  return error == std::errc() ? std::string(digits.data(), end) : std::string("?");
}

std::string short_text(double value) {
  std::array<char, 32> digits{};
  const auto [end, error] =
      std::to_chars(digits.data(), digits.data() + digits.size(), value, std::chars_format::general, 4);
  return error == std::errc() ? std::string(digits.data(), end) : std::string("?");
}

namespace {

// Length of the well-formed UTF-8 sequence at the start of `text`, 0 where there is none.
std::size_t utf8_length(std::string_view text) {
  const auto byte = [&](std::size_t i) { return static_cast<unsigned char>(text[i]); };
  const unsigned char lead = byte(0);
  const std::size_t length = lead < 0x80   ? 1
                             : lead < 0xc2 ? 0
                             : lead < 0xe0 ? 2
                             : lead < 0xf0 ? 3
                             : lead < 0xf5 ? 4
                                           : 0;
  if (length == 0 || length > text.size()) return 0;
  for (std::size_t i = 1; i < length; ++i) {
    if ((byte(i) & 0xc0) != 0x80) return 0;
  }
  if ((lead == 0xe0 && byte(1) < 0xa0) || (lead == 0xed && byte(1) >= 0xa0)) return 0;  // overlong, surrogate
  if ((lead == 0xf0 && byte(1) < 0x90) || (lead == 0xf4 && byte(1) >= 0x90)) return 0;  // overlong, beyond U+10FFFF
  return length;
}

}  // namespace

std::string printable(std::string_view text) {
  constexpr std::string_view hex = "0123456789abcdef";
  std::string out;
  for (std::size_t i = 0, count = 0; i < text.size(); ++count) {
    if (count == 80) return out + "...";
    const auto byte = static_cast<unsigned char>(text[i]);
    const std::size_t length = utf8_length(text.substr(i));
    if (length == 0 || byte < 0x20 || byte == 0x7f) {
      out += "\\x", out += hex[byte >> 4], out += hex[byte & 15], ++i;
    } else {
      out += text.substr(i, length), i += length;
    }
  }
  return out;
}

std::string found_text(const Node& node) {
  switch (node.kind) {
    case Node::Kind::table:
      return "a table";
    case Node::Kind::array:
      return "an array of " + std::to_string(node.children.size()) + " values";
    case Node::Kind::text:
      return "\"" + printable(node.text) + "\" (a string)";
    case Node::Kind::whole:
      return std::to_string(node.whole) + " (a whole number)";
    case Node::Kind::real:
      return number_text(node.real) + " (a real number)";
    case Node::Kind::truth:
      return node.truth ? "true" : "false";
    case Node::Kind::date:
      return "a date or time";
  }
  return "?";
}

}  // namespace slipbench
