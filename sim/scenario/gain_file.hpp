// Gain file: a TOML fragment that [controller] or an [[estimator]] names by its key `file`; keys given there override it.
//
//   format = 1
//   title = "..."           # optional, and source
//   [controller]            # settings of state_feedback: gain_period_s, gain_frequency_Hz, K, K_integral, reference_gain, L
//   [estimator]             # settings of linear_observer: gain_period_s, gain_frequency_Hz, L
//
// One of the two tables at least. Matrices row by row, one a speed; keys.hpp has ranges and meaning. What a file was designed
// for stands in comments at its head, one `# name: value` a line.
#pragma once

#include <array>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "plant/setting.hpp"
#include "sim/scenario/tree.hpp"

namespace slipbench {

inline constexpr std::array<std::string_view, 3> gain_file_heads = {"format", "title", "source"};

struct GainFile {
  std::string title;
  std::vector<std::pair<std::string, std::string>> made_for;  // name, value: the comments at the head
  Settings controller, estimator;                             // numbers and tables; an empty one is left out
};
std::string gain_file_text(const GainFile& gains);

// Whether this is a gain file and nothing else.
bool is_gain_file(const Node& root);
// Adds what `into` ([controller], or one [[estimator]]) lacks from the file's table of that name; InputError placed in the file.
void merge_gains(Node& into, const Node& file, const std::string& table);
// Reads a gain file by itself: every key known, of its type, in range.
void check_gain_file(const Node& root);

}  // namespace slipbench
