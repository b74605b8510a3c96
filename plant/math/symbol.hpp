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
// only that it is one is kept, not its payload). A symbol without variables is a plain constant and needs no program; it
// remembers how it came about ("period * R_s"). min, max, clamp and the elementary functions are one node each, and one
// function in the emitted code. While a program listens (Listening), labels.hpp's names and headings are kept in it.
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
#include "plant/math/frames.hpp"
#include "plant/math/labels.hpp"
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
  minimum,
  maximum,
  limit,              // clamp(a, b, c)
  sine_cosine,        // a pair, of which the next two take one each
  sine_cosine_turns,  // the same
  sine_of,
  cosine_of,
  arctangent,  // atan2(a, b)
  exponential,
  logarithm,
  wrapped,
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
  Scalar value{};                               // of a constant; masks: 0 or 1
  std::shared_ptr<const std::string> origin{};  // of a constant: its name, or how it came about
};

// Records `op` on up to three operands, or folds it.
template <class S>
SymbolNode<S> record(SymbolOp op, const SymbolNode<S>& a, const SymbolNode<S>& b = {}, const SymbolNode<S>& c = {});

template <class S>
bool truth_of(const SymbolNode<S>& constant);

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
  // Of a choice that constants make; std::logic_error where it hangs on data.
  friend bool any(const SymbolMask& a) { return truth_of(a.node()); }

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
  // A constant with a name, for those who read the emitted code.
  static Symbol named(double constant, const std::string& name) {
    Symbol x(constant);
    x.node_.origin = std::make_shared<const std::string>(name);
    return x;
  }
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
  friend Symbol min(const Symbol& a, const Symbol& b) { return of(SymbolOp::minimum, a, b); }
  friend Symbol max(const Symbol& a, const Symbol& b) { return of(SymbolOp::maximum, a, b); }
  friend Symbol clamp(const Symbol& x, const Symbol& low, const Symbol& high) {
    return Symbol(record<S>(SymbolOp::limit, x.node_, low.node_, high.node_));
  }
  friend Symbol atan2(const Symbol& y, const Symbol& x) { return of(SymbolOp::arctangent, y, x); }
  friend Symbol exp(const Symbol& a) { return of(SymbolOp::exponential, a); }
  friend Symbol log(const Symbol& a) { return of(SymbolOp::logarithm, a); }
  friend Symbol wrap_angle(const Symbol& a) { return of(SymbolOp::wrapped, a); }
  friend SinCos<Symbol> sincos(const Symbol& a) { return pair_of(SymbolOp::sine_cosine, a); }
  friend SinCos<Symbol> sincos_turns(const Symbol& a) { return pair_of(SymbolOp::sine_cosine_turns, a); }
  friend Mask operator<(const Symbol& a, const Symbol& b) { return compare(SymbolOp::less, a, b); }
  friend Mask operator<=(const Symbol& a, const Symbol& b) { return compare(SymbolOp::less_equal, a, b); }
  friend Mask operator>(const Symbol& a, const Symbol& b) { return b < a; }
  friend Mask operator>=(const Symbol& a, const Symbol& b) { return b <= a; }
  friend Mask operator==(const Symbol& a, const Symbol& b) { return compare(SymbolOp::equal, a, b); }
  friend Mask operator!=(const Symbol& a, const Symbol& b) { return !(a == b); }

 private:
  static Symbol of(SymbolOp op, const Symbol& a) { return Symbol(record<S>(op, a.node_)); }
  static Symbol of(SymbolOp op, const Symbol& a, const Symbol& b) { return Symbol(record<S>(op, a.node_, b.node_)); }
  static SinCos<Symbol> pair_of(SymbolOp op, const Symbol& a);
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
  void label(const std::string& name, const SymbolNode<S>& n) {
    if (n.graph == this) labels.try_emplace(n.id, name);
  }
  std::vector<Node> nodes;
  std::map<std::uint32_t, std::string> labels, origins;         // of nodes; of constants
  std::vector<std::pair<std::uint32_t, std::string>> sections;  // heading of the nodes from that one on
  static inline thread_local Graph* listening = nullptr;

 private:
  std::map<std::array<std::uint64_t, 5>, std::uint32_t> known_;
  std::map<std::string, std::uint32_t> known_origins_;
};

template <class S>
struct Notes<Symbol<S>> {
  static constexpr bool kept = true;
  static void section(const char* text) {
    if (auto* graph = Graph<S>::listening) graph->sections.emplace_back(graph->nodes.size(), text);
  }
  static void label(const std::string& name, const Symbol<S>& x) {
    if (auto* graph = Graph<S>::listening) graph->label(name, x.node());
  }
};
template <class S>
struct Notes<SymbolMask<S>> {
  static constexpr bool kept = true;
  static void label(const std::string& name, const SymbolMask<S>& m) {
    if (auto* graph = Graph<S>::listening) graph->label(name, m.node());
  }
};

// A straight-line function in the making: inputs, outputs, names. An array is one parameter of the emitted function; one
// that holds inputs and outputs (a state) is read before it is written.
template <class S>
class Program {
 public:
  // While it lives, labels and sections of this thread's steps go to this program.
  class Listening {
   public:
    explicit Listening(Program& program) : before_(Graph<S>::listening) { Graph<S>::listening = program.graph_.get(); }
    ~Listening() { Graph<S>::listening = before_; }
    Listening(const Listening&) = delete;
    Listening& operator=(const Listening&) = delete;

   private:
    Graph<S>* before_;
  };

  // Where a number is read or written: its name, and the C expression of its place.
  struct Port {
    std::string name, place, array;
    std::size_t element = 0;
    SymbolNode<S> node;
  };

  // A fresh variable, read from the next free element of `array`.
  Symbol<S> input(const std::string& name, const std::string& array = "in");
  // Written to the next free element of `array`.
  void output(const std::string& name, const Symbol<S>& value, const std::string& array = "out");
  // The same at a place of the caller's own, such as "state->speed".
  Symbol<S> input_at(const std::string& place, const std::string& name);
  void output_at(const std::string& place, const std::string& name, const Symbol<S>& value);
  // Names an intermediate result in the emitted code; the first name given stays.
  void name(const std::string& name, const Symbol<S>& value) { graph_->label(name, value.node()); }

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

  // What symbol_text.hpp writes from.
  [[nodiscard]] const Graph<S>& graph() const { return *graph_; }
  [[nodiscard]] const std::vector<Port>& read() const { return inputs_; }
  [[nodiscard]] const std::vector<Port>& written() const { return outputs_; }
  [[nodiscard]] std::vector<bool> needed() const;

 private:
  std::unique_ptr<Graph<S>> graph_ = std::make_unique<Graph<S>>();
  std::vector<Port> inputs_, outputs_;
};

// How many operands an operation has.
std::size_t operand_count(SymbolOp op);

}  // namespace slipbench
