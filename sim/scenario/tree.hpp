// A TOML text as plain nodes that know where they stand: what the readers walk, so that one unit alone knows toml++.
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "sim/scenario/input_error.hpp"

namespace slipbench {

// Where something stands: a file (or "--set:key", which has no line), line and column from 1; line 0: the file as such.
struct Place {
  std::shared_ptr<const std::string> file;
  unsigned line = 0, column = 0;
  [[nodiscard]] std::string text() const;
};

struct Node {
  enum class Kind { table, array, text, whole, real, truth, date };
  Kind kind = Kind::table;
  std::string name;         // key within its table; "" in an array
  Place place, name_place;  // of the value; of its key
  std::string text;
  std::int64_t whole = 0;
  double real = 0.0;
  bool truth = false;
  std::vector<Node> children;  // of a table in file order, of an array by number

  [[nodiscard]] const Node* child(std::string_view key) const;
  [[nodiscard]] Node* child(std::string_view key);
  [[nodiscard]] bool is_number() const { return kind == Kind::whole || kind == Kind::real; }
  [[nodiscard]] double number() const { return kind == Kind::whole ? static_cast<double>(whole) : real; }
};

// Follows a dotted key ("estimator.1.kind"); null where it leads nowhere.
const Node* find(const Node& root, std::string_view dotted);

// What a person reads of it: `"abc" (a string)`, `-3 (a whole number)`, `an array of 2 values`.
std::string found_text(const Node& node);
// Printable on one line: control and non-UTF-8 bytes escaped, cut at 80 characters.
std::string printable(std::string_view text);
// Shortest decimal that reads back the same.
std::string number_text(double value);
std::string short_text(double value);  // four digits, for what was computed

// Largest file read, bytes, and deepest nesting of brackets and dotted keys: far beyond any honest scenario.
inline constexpr std::size_t largest_file = 4u << 20;
inline constexpr int deepest_nesting = 32;

// Throws InputError at the syntax error. `name` is what places say.
Node parse_toml(std::string_view text, const std::string& name);
// One value as typed after `--set key=`: TOML, and what is not valid TOML is a string. All nodes are placed at `place`.
Node parse_value(std::string_view text, const Place& place);

// The whole of a file; nullopt with the reason in `why` where it can't be had (missing, directory, too large, empty).
std::optional<std::string> read_text(const std::string& path, std::string& why);

}  // namespace slipbench
