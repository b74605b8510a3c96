// A recorded program as C99 text: the statements of a function's body, what they need, and how much they compute.
//
//   const Body<float> body = body_of(program, {"state", "sample"}, Constants::named);
//   body.constants      "static const float R_s = 0x1.7ae148p+0f; /* 1.48 */", a line a constant
//   body.statements     a line a result, in the order of recording, headings as comments
//   helper_functions<float>(body.helpers, "drive_")   the elementary functions that are called
//
// What is used once, has no name and is short stands inside the expression that uses it, parenthesised so that the order of
// operations stays the recorded one. Each operation is rounded by itself: under -ffp-contract=off, FLT_EVAL_METHOD 0 and
// IEEE 754 arithmetic the bits are those of the simulation.
#pragma once

#include <set>
#include <string>
#include <vector>

#include "plant/math/symbol.hpp"

namespace slipbench {

enum class Constants { inlined, named };

// Operations of one call, those of the functions it calls included. A clamp is two comparisons and two choices.
struct OperationCount {
  std::size_t add = 0, multiply = 0, divide = 0, root = 0, compare = 0, choose = 0, other = 0;
  [[nodiscard]] std::size_t all() const { return add + multiply + divide + root + compare + choose + other; }
  void include(const OperationCount& more);
};

template <class S>
struct Body {
  std::string constants, statements;
  std::set<SymbolOp> helpers;
  OperationCount operations;
};

// An output whose place is "return" is returned. `taken`: identifiers that the body may not use. `prefix` stands before the names of helper functions.
template <class S>
Body<S> body_of(const Program<S>& program, std::set<std::string> taken, Constants constants, const std::string& prefix);

// Static C functions for these operations and for those they need themselves.
template <class S>
std::string helper_functions(const std::set<SymbolOp>& wanted, const std::string& prefix);
template <class S>
OperationCount operations_of_helper(SymbolOp op);
// "drive_clamp"; empty for an operation that C has.
template <class S>
std::string helper_name(SymbolOp op, const std::string& prefix);

// "float", and "f" behind its literals; "double", and nothing.
template <class S>
const char* c_type();
template <class S>
const char* c_suffix();
// Whole numbers and simple fractions in decimal, all others as hexadecimal floats: either way to the bit.
template <class S>
std::string c_literal(S value);
// An identifier from any text: no word of C, no odd character.
std::string c_identifier(std::string name);

}  // namespace slipbench
