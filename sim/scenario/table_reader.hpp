// One table of a file that the table of keys doesn't describe (plans, state-space files): what was asked for is taken, what was not is
// refused, with the place, the key, what was found, what is allowed and the nearest name.
#pragma once

#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

#include "sim/scenario/tree.hpp"

namespace slipbench {

class TableReader {
 public:
  // `shown` is the table's dotted name in errors ("" for the top). InputError at an unknown key. `node` must outlive it.
  TableReader(const Node& node, std::string shown, std::vector<std::string_view> known);

  [[nodiscard]] const Node& node() const { return node_; }
  [[nodiscard]] const std::string& shown() const { return shown_; }
  [[nodiscard]] const Node* child(std::string_view name) const { return node_.child(name); }
  [[nodiscard]] std::string dotted(std::string_view name) const;
  [[noreturn]] void wrong(const Node& at, std::string_view name, const std::string& wanted,
                          const char* code = "type") const;
  const Node& need(std::string_view name, const std::string& wanted) const;
  [[nodiscard]] double number(std::string_view name) const;  // finite
  [[nodiscard]] std::uint64_t whole(std::string_view name, std::uint64_t low, std::uint64_t high) const;
  // One of `words`; any string where there are none.
  [[nodiscard]] std::string word(std::string_view name, const std::vector<std::string_view>& words) const;

 private:
  const Node& node_;
  std::string shown_;
  std::vector<std::string_view> known_;
};

}  // namespace slipbench
