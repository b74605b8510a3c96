#include "sim/scenario/write.hpp"

#include <algorithm>
#include <array>
#include <cstdio>

namespace slipbench {

namespace {

std::string quoted_text(const std::string& text) {
  std::string out = "\"";
  for (const char c : text) {
    if (c == '"' || c == '\\') {
      out += std::string("\\") + c;
    } else if (static_cast<unsigned char>(c) < 0x20 || c == 0x7f) {
      std::array<char, 8> code{};
      std::snprintf(code.data(), code.size(), "\\u%04x", static_cast<unsigned>(static_cast<unsigned char>(c)));
      out += code.data();
    } else {
      out += c;
    }
  }
  return out + "\"";
}

std::string key_text(const std::string& name) {
  const bool bare =
      !name.empty() &&
      name.find_first_not_of("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_-") == std::string::npos;
  return bare ? name : quoted_text(name);
}

std::string value_text(const Node& node) {
  std::string out;
  switch (node.kind) {
    case Node::Kind::whole:
      return std::to_string(node.whole);
    case Node::Kind::real:
      out = number_text(node.real);
      return out.find_first_of(".en") == std::string::npos ? out + ".0" : out;  // else it would read back as whole
    case Node::Kind::truth:
      return node.truth ? "true" : "false";
    case Node::Kind::text:
      return quoted_text(node.text);
    case Node::Kind::date:
      break;  // no key takes one
    case Node::Kind::array:
      for (const Node& child : node.children) out += (out.empty() ? "" : ", ") + value_text(child);
      return "[" + out + "]";
    case Node::Kind::table:
      for (const Node& child : node.children)
        out += (out.empty() ? " " : ", ") + key_text(child.name) + " = " + value_text(child);
      return "{" + out + " }";
  }
  return out;
}

bool is_list_of_tables(const Node& node) {
  return node.kind == Node::Kind::array && !node.children.empty() &&
         std::all_of(node.children.begin(), node.children.end(),
                     [](const Node& child) { return child.kind == Node::Kind::table; });
}

void add_table(std::string& out, const Node& table, const std::string& path) {
  const auto dotted = [&](const Node& child) {
    return path.empty() ? key_text(child.name) : path + "." + key_text(child.name);
  };
  for (const Node& child : table.children) {
    if (child.kind != Node::Kind::table && !is_list_of_tables(child))
      out += key_text(child.name) + " = " + value_text(child) + "\n";
  }
  for (const Node& child : table.children) {
    if (child.kind == Node::Kind::table) {
      out += "\n[" + dotted(child) + "]\n";
      add_table(out, child, dotted(child));
    } else if (is_list_of_tables(child)) {
      for (const Node& element : child.children) {
        out += "\n[[" + dotted(child) + "]]\n";
        add_table(out, element, dotted(child));
      }
    }
  }
}

}  // namespace

std::string toml_text(const Node& root) {
  std::string out;
  add_table(out, root, "");
  return out;
}

}  // namespace slipbench
