// Symbol<Scalar>: a number that writes down what was computed with it, and Program<Scalar>, which emits that as C99.
//
//   Program<float> program;
//   const auto x = program.input("x"), y = program.input("y");
//   program.output("length", sqrt(x * x + y * y));
//   std::string c = program.emit_c("length_of");    // void length_of(const float in[2], float out[1])
//
// Scalar (float or double) is the precision of the emitted code. Equal expressions are one node (hash-consing), so common
// subexpressions are shared. Constants are folded in Scalar, and identities used, only where no bit can change: x * 1, x / 1,
// x - 0 and x + (-0) vanish; x + 0 does only where x cannot be -0; x * 0 and x - x stay, for infinities and NaN (of a NaN
// only that it is one is kept, not its payload). A symbol without variables is a plain constant and needs no program.
// A symbol must not outlive the Program whose inputs it came from, nor meet those of another.
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <map>
#include <memory>
#include <string>
#include <vector>

#include "plant/math/fields.hpp"
#include "plant/math/numbers.hpp"

namespace slipbench {

enum class SymbolOp : std::uint8_t {
  constant,
  input,
  add,
  subtract,
  multiply,
  divide,
  negate,
  root,
  floor,
  size,
  two_to_the,
  exponent_of,
  select,
  truth,
  less,
  less_equal,
  equal,
  both,
  either,
  opposite  // from `truth` on: masks
};

template <class Scalar>
class Graph;
template <class Scalar>
class Symbol;

// Where a node stands: in a graph, or nowhere for a constant, whose value is kept here.
template <class Scalar>
struct SymbolNode {
  Graph<Scalar>* graph = nullptr;
  std::uint32_t id = 0;
  Scalar value{};  // of a constant; masks: 0 or 1
};

// Records `op` on up to three operands, or folds it.
template <class S>
SymbolNode<S> record(SymbolOp op, const SymbolNode<S>& a, const SymbolNode<S>& b = {}, const SymbolNode<S>& c = {});

template <class S>
class SymbolMask {
 public:
  SymbolMask() = default;
  explicit SymbolMask(bool truth) { node_.value = S(truth); }
  explicit SymbolMask(const SymbolNode<S>& node) : node_(node) {}
  [[nodiscard]] const SymbolNode<S>& node() const { return node_; }

  friend SymbolMask operator&(const SymbolMask& a, const SymbolMask& b) {
    return SymbolMask(record<S>(SymbolOp::both, a.node(), b.node()));
  }
  friend SymbolMask operator|(const SymbolMask& a, const SymbolMask& b) {
    return SymbolMask(record<S>(SymbolOp::either, a.node(), b.node()));
  }
  friend SymbolMask operator!(const SymbolMask& a) { return SymbolMask(record<S>(SymbolOp::opposite, a.node())); }

 private:
  SymbolNode<S> node_;
};

template <class S>
class Symbol {
 public:
  using Mask = SymbolMask<S>;
  using Count = std::int64_t;  // whole numbers are structural: known when the program is recorded
  using Scalar = S;

  Symbol() = default;
  explicit Symbol(double constant) { node_.value = static_cast<S>(constant); }
  explicit Symbol(const SymbolNode<S>& node) : node_(node) {}
  [[nodiscard]] const SymbolNode<S>& node() const { return node_; }
  [[nodiscard]] bool is_constant() const { return node_.graph == nullptr; }
  [[nodiscard]] S value() const { return node_.value; }  // of a constant

  friend Symbol operator+(const Symbol& a, const Symbol& b) { return of(SymbolOp::add, a, b); }
  friend Symbol operator-(const Symbol& a, const Symbol& b) { return of(SymbolOp::subtract, a, b); }
  friend Symbol operator*(const Symbol& a, const Symbol& b) { return of(SymbolOp::multiply, a, b); }
  friend Symbol operator/(const Symbol& a, const Symbol& b) { return of(SymbolOp::divide, a, b); }
  friend Symbol operator-(const Symbol& a) { return of(SymbolOp::negate, a); }
  friend Symbol sqrt(const Symbol& a) { return of(SymbolOp::root, a); }
  friend Symbol floor(const Symbol& a) { return of(SymbolOp::floor, a); }
  friend Symbol fabs(const Symbol& a) { return of(SymbolOp::size, a); }
  friend Symbol two_to_the(const Symbol& a) { return of(SymbolOp::two_to_the, a); }
  friend Symbol exponent_of(const Symbol& a) { return of(SymbolOp::exponent_of, a); }
  friend Symbol select(const Mask& m, const Symbol& yes, const Symbol& no) {
    return Symbol(record<S>(SymbolOp::select, m.node(), yes.node_, no.node_));
  }
  friend Mask operator<(const Symbol& a, const Symbol& b) { return compare(SymbolOp::less, a, b); }
  friend Mask operator<=(const Symbol& a, const Symbol& b) { return compare(SymbolOp::less_equal, a, b); }
  friend Mask operator>(const Symbol& a, const Symbol& b) { return b < a; }
  friend Mask operator>=(const Symbol& a, const Symbol& b) { return b <= a; }
  friend Mask operator==(const Symbol& a, const Symbol& b) { return compare(SymbolOp::equal, a, b); }
  friend Mask operator!=(const Symbol& a, const Symbol& b) { return !(a == b); }

 private:
  static Symbol of(SymbolOp op, const Symbol& a) { return Symbol(record<S>(op, a.node_)); }
  static Symbol of(SymbolOp op, const Symbol& a, const Symbol& b) { return Symbol(record<S>(op, a.node_, b.node_)); }
  static Mask compare(SymbolOp op, const Symbol& a, const Symbol& b) { return Mask(record<S>(op, a.node_, b.node_)); }

  SymbolNode<S> node_;
};

// The nodes, each after its operands. Kept apart from Program so that a program can be moved.
template <class S>
class Graph {
 public:
  struct Node {
    SymbolOp op;
    std::uint32_t a, b, c;  // operands; of an input, `a` is its number
    S value;                // of a constant
    bool never_minus_zero;
  };
  std::uint32_t node(Node n);
  std::uint32_t id_of(const SymbolNode<S>& n, bool mask);
  std::vector<Node> nodes;

 private:
  std::map<std::array<std::uint64_t, 5>, std::uint32_t> known_;
};

// A straight-line function in the making: inputs, outputs, names. An array is one parameter of the emitted function; one
// that holds inputs and outputs (a state) is read before it is written.
template <class S>
class Program {
 public:
  // A fresh variable, read from the next free element of `array`.
  Symbol<S> input(const std::string& name, const std::string& array = "in");
  // Written to the next free element of `array`.
  void output(const std::string& name, const Symbol<S>& value, const std::string& array = "out");
  // Names an intermediate result in the emitted code; the first name given stays.
  void name(const std::string& name, const Symbol<S>& value);

  // Every number of a struct, in written order, named by its fields.
  template <class Struct>
  void inputs(Struct& item, const std::string& array) {
    each_named(std::string(), item, [&](const std::string& n, Symbol<S>& x) { x = input(n, array); });
  }
  template <class Struct>
  void outputs(const Struct& item, const std::string& array) {
    each_named(std::string(), item, [&](const std::string& n, const Symbol<S>& x) { output(n, x, array); });
  }
  template <class Struct>
  void name_fields(const std::string& prefix, const Struct& item) {
    each_named(prefix, item, [&](const std::string& n, const Symbol<S>& x) { name(n, x); });
  }

  // A C99 translation unit with the one function `void function_name(...)`, arrays in the order of first use. The comment
  // at its head says under which flags its bits are those of the simulation.
  [[nodiscard]] std::string emit_c(const std::string& function_name) const;
  // How many nodes of each operation the outputs need.
  [[nodiscard]] std::map<SymbolOp, std::size_t> operation_counts() const;

 private:
  struct Port {
    std::string name, array;
    std::size_t element;
    SymbolNode<S> node;
  };
  [[nodiscard]] std::vector<bool> needed() const;
  std::string unique(std::string name);

  std::unique_ptr<Graph<S>> graph_ = std::make_unique<Graph<S>>();
  std::vector<Port> inputs_, outputs_;
  std::map<std::uint32_t, std::string> names_;
  std::map<std::string, int> taken_;
};

}  // namespace slipbench
