#include "plant/math/symbol.hpp"

#include <bit>
#include <cstdio>
#include <stdexcept>
#include <type_traits>
#include <utility>

#include "plant/math/elementary.hpp"

namespace slipbench {

namespace {

template <class S>
using BitsOf = std::conditional_t<sizeof(S) == 8, std::uint64_t, std::uint32_t>;

template <class S>
bool is(const SymbolNode<S>& n, double constant) {  // that constant, to the sign of zero
  return n.graph == nullptr && std::bit_cast<BitsOf<S>>(n.value) == std::bit_cast<BitsOf<S>>(static_cast<S>(constant));
}
template <class S>
bool same(const SymbolNode<S>& a, const SymbolNode<S>& b) {
  if (a.graph != b.graph) return false;
  return a.graph ? a.id == b.id : std::bit_cast<BitsOf<S>>(a.value) == std::bit_cast<BitsOf<S>>(b.value);
}
template <class S>
SymbolNode<S> constant(S value) {
  return {nullptr, 0, value, {}};
}
template <class S>
const typename Graph<S>::Node* node_of(const SymbolNode<S>& n) {
  return n.graph ? &n.graph->nodes[n.id] : nullptr;
}
template <class S>
bool never_minus_zero(const SymbolNode<S>& n) {
  return n.graph ? node_of(n)->never_minus_zero : !is(n, -0.0);
}
// -x or x * -1: the operand without its sign change, if it is one.
template <class S>
bool negated(const SymbolNode<S>& n, SymbolNode<S>& inner) {
  const auto* node = node_of(n);
  if (!node || node->op != SymbolOp::negate) return false;
  inner = {n.graph, node->a, S{}, {}};
  return true;
}

template <class S>
S fold(SymbolOp op, S a, S b, S c) {
  switch (op) {
    case SymbolOp::add:
      return a + b;
    case SymbolOp::subtract:
      return a - b;
    case SymbolOp::multiply:
      return a * b;
    case SymbolOp::divide:
      return a / b;
    case SymbolOp::negate:
      return -a;
    case SymbolOp::root:
      return sqrt(a);
    case SymbolOp::floor:
      return floor(a);
    case SymbolOp::size:
      return fabs(a);
    case SymbolOp::two_to_the:
      return two_to_the(a);
    case SymbolOp::exponent_of:
      return exponent_of(a);
    case SymbolOp::select:
      return a != S(0) ? b : c;
    case SymbolOp::minimum:
      return slipbench::min(a, b);
    case SymbolOp::maximum:
      return slipbench::max(a, b);
    case SymbolOp::limit:
      return slipbench::clamp(a, b, c);
    case SymbolOp::arctangent:
      return slipbench::atan2(a, b);
    case SymbolOp::exponential:
      return slipbench::exp(a);
    case SymbolOp::logarithm:
      return slipbench::log(a);
    case SymbolOp::wrapped:
      return slipbench::wrap_angle(a);
    case SymbolOp::less:
      return S(a < b);
    case SymbolOp::less_equal:
      return S(a <= b);
    case SymbolOp::equal:
      return S(a == b);
    case SymbolOp::both:
      return S(a != S(0) && b != S(0));
    case SymbolOp::either:
      return S(a != S(0) || b != S(0));
    case SymbolOp::opposite:
      return S(a == S(0));
    case SymbolOp::sine_cosine:
    case SymbolOp::sine_cosine_turns:
    case SymbolOp::sine_of:
    case SymbolOp::cosine_of:
    case SymbolOp::constant:
    case SymbolOp::input:
    case SymbolOp::truth:
      break;
  }
  return a;
}

// How a folded constant came about, in words of its parts'; nothing where no part has a name.
template <class S>
std::shared_ptr<const std::string> origin_of(SymbolOp op, const SymbolNode<S>& a, const SymbolNode<S>& b) {
  constexpr std::size_t longest = 60;
  if (!a.origin && !b.origin) return {};
  const auto text = [](const SymbolNode<S>& n) {
    if (n.origin) return n.origin->find(' ') == std::string::npos ? *n.origin : "(" + *n.origin + ")";
    char digits[32];
    std::snprintf(digits, sizeof digits, "%.6g", static_cast<double>(n.value));
    return std::string(digits);
  };
  std::string all;
  switch (op) {
    case SymbolOp::add:
      all = text(a) + " + " + text(b);
      break;
    case SymbolOp::subtract:
      all = text(a) + " - " + text(b);
      break;
    case SymbolOp::multiply:
      all = text(a) + " * " + text(b);
      break;
    case SymbolOp::divide:
      all = text(a) + " / " + text(b);
      break;
    case SymbolOp::negate:
      all = "-" + text(a);
      break;
    case SymbolOp::root:
      all = "sqrt(" + text(a) + ")";
      break;
    default:
      return {};
  }
  return all.size() > longest ? nullptr : std::make_shared<const std::string>(all);
}

// Identities that keep every bit. True where `result` is the answer; else `op`, `a`, `b` may have been put more simply.
template <class S>
bool simplify(SymbolOp& op, SymbolNode<S>& a, SymbolNode<S>& b, const SymbolNode<S>& c, SymbolNode<S>& result) {
  SymbolNode<S> inner, inner_b;
  const auto becomes = [&](const SymbolNode<S>& n) {
    result = n;
    return true;
  };
  if (op == SymbolOp::add) {
    if (is(a, -0.0) || (is(a, 0.0) && never_minus_zero(b))) return becomes(b);
    if (is(b, -0.0) || (is(b, 0.0) && never_minus_zero(a))) return becomes(a);
    if (negated(b, inner))
      op = SymbolOp::subtract, b = inner;
    else if (negated(a, inner))
      op = SymbolOp::subtract, a = b, b = inner;
  }
  if (op == SymbolOp::subtract) {
    if (is(b, 0.0) || (is(b, -0.0) && never_minus_zero(a))) return becomes(a);
    if (negated(b, inner))
      op = SymbolOp::add, b = inner;
    else if (is(a, -0.0))
      op = SymbolOp::negate, a = b, b = {};
  }
  if (op == SymbolOp::multiply || op == SymbolOp::divide) {
    if (is(b, 1.0)) return becomes(a);
    if (op == SymbolOp::multiply && is(a, 1.0)) return becomes(b);
    if (is(b, -1.0))
      op = SymbolOp::negate, b = {};
    else if (op == SymbolOp::multiply && is(a, -1.0))
      op = SymbolOp::negate, a = b, b = {};
    else if (negated(a, inner) && negated(b, inner_b))
      a = inner, b = inner_b;
  }
  if (op == SymbolOp::negate && negated(a, inner)) return becomes(inner);
  if (op == SymbolOp::size) {
    if (negated(a, inner)) a = inner;
    if (a.graph && node_of(a)->op == SymbolOp::size) return becomes(a);
  }
  if (op == SymbolOp::select) {
    if (!a.graph) return becomes(a.value != S(0) ? b : c);
    if (same(b, c)) return becomes(b);
  }
  if ((op == SymbolOp::minimum || op == SymbolOp::maximum) && same(a, b)) return becomes(a);
  if (op == SymbolOp::less && same(a, b)) return becomes(constant(S(0)));
  if (op == SymbolOp::both || op == SymbolOp::either) {
    const S decides = S(op == SymbolOp::either);
    if (!a.graph) return becomes(a.value == decides ? a : b);
    if (!b.graph) return becomes(b.value == decides ? b : a);
    if (same(a, b)) return becomes(a);
  }
  if (op == SymbolOp::opposite && a.graph && node_of(a)->op == SymbolOp::opposite) {
    return becomes({a.graph, node_of(a)->a, S{}, {}});
  }
  return false;
}

// Round to nearest: a sum is -0 only if both terms are; a product of a number with itself never is.
template <class S>
bool never_minus_zero(SymbolOp op, const SymbolNode<S>& a, const SymbolNode<S>& b, const SymbolNode<S>& c) {
  switch (op) {
    case SymbolOp::add:
      return never_minus_zero(a) || never_minus_zero(b);
    case SymbolOp::subtract:
      return never_minus_zero(a);
    case SymbolOp::multiply:
      return same(a, b);
    case SymbolOp::size:
    case SymbolOp::two_to_the:
    case SymbolOp::exponent_of:
      return true;
    case SymbolOp::root:
      return never_minus_zero(a);
    case SymbolOp::select:
      return never_minus_zero(b) && never_minus_zero(c);
    case SymbolOp::minimum:
    case SymbolOp::maximum:
      return never_minus_zero(a) && never_minus_zero(b);
    case SymbolOp::limit:
      return never_minus_zero(a) && never_minus_zero(b) && never_minus_zero(c);
    default:
      return false;
  }
}

bool commutes(SymbolOp op) {
  return op == SymbolOp::add || op == SymbolOp::multiply || op == SymbolOp::equal || op == SymbolOp::both ||
         op == SymbolOp::either;
}
bool mask_operands(SymbolOp op) { return op == SymbolOp::both || op == SymbolOp::either || op == SymbolOp::opposite; }
}  // namespace

std::size_t operand_count(SymbolOp op) {
  switch (op) {
    case SymbolOp::select:
    case SymbolOp::limit:
      return 3;
    case SymbolOp::negate:
    case SymbolOp::root:
    case SymbolOp::floor:
    case SymbolOp::size:
    case SymbolOp::two_to_the:
    case SymbolOp::exponent_of:
    case SymbolOp::sine_cosine:
    case SymbolOp::sine_cosine_turns:
    case SymbolOp::sine_of:
    case SymbolOp::cosine_of:
    case SymbolOp::exponential:
    case SymbolOp::logarithm:
    case SymbolOp::wrapped:
    case SymbolOp::opposite:
      return 1;
    case SymbolOp::constant:
    case SymbolOp::input:
    case SymbolOp::truth:
      return 0;
    default:
      return 2;
  }
}

template <class S>
std::uint32_t Graph<S>::node(Node n) {
  // A sum is the same whichever way round; it keeps the order in which it was first written.
  const bool turned = commutes(n.op) && n.b < n.a;
  const std::uint32_t first = turned ? n.b : n.a, second = turned ? n.a : n.b;
  const std::array<std::uint64_t, 5> key{static_cast<std::uint64_t>(n.op), first, second, n.c,
                                         std::bit_cast<BitsOf<S>>(n.value)};
  const auto [place, fresh] = known_.try_emplace(key, static_cast<std::uint32_t>(nodes.size()));
  if (fresh) nodes.push_back(n);
  return place->second;
}

template <class S>
std::uint32_t Graph<S>::id_of(const SymbolNode<S>& n, bool mask) {
  if (n.graph == nullptr) {
    // Constants that came about differently stay apart, or one would bear the other's name.
    std::uint32_t told = 0;
    if (n.origin) {
      const auto next = static_cast<std::uint32_t>(known_origins_.size() + 1);
      told = known_origins_.try_emplace(*n.origin, next).first->second;
    }
    const std::uint32_t id = node({mask ? SymbolOp::truth : SymbolOp::constant, told, 0, 0, n.value, !is(n, -0.0)});
    if (n.origin) origins.try_emplace(id, *n.origin);
    return id;
  }
  if (n.graph != this) throw std::logic_error("symbols of two programs cannot meet");
  return n.id;
}

template <class S>
SymbolNode<S> record(SymbolOp op, const SymbolNode<S>& first, const SymbolNode<S>& second, const SymbolNode<S>& c) {
  SymbolNode<S> a = first, b = second, result;
  if (!a.graph && !b.graph && !c.graph)
    return {nullptr, 0, fold(op, a.value, b.value, c.value),
            op == SymbolOp::select ? (a.value != S(0) ? b : c).origin : origin_of(op, a, b)};
  if (simplify(op, a, b, c, result)) return result;
  Graph<S>* graph = a.graph ? a.graph : b.graph ? b.graph : c.graph;
  const std::size_t count = operand_count(op);
  typename Graph<S>::Node n{op, 0, 0, 0, S{}, never_minus_zero(op, a, b, c)};
  n.a = graph->id_of(a, mask_operands(op) || op == SymbolOp::select);
  if (count > 1) n.b = graph->id_of(b, mask_operands(op));
  if (count > 2) n.c = graph->id_of(c, false);
  return {graph, graph->node(n), S{}, {}};
}

template <class S>
bool truth_of(const SymbolNode<S>& constant) {
  if (constant.graph != nullptr) throw std::logic_error("a step branches on data: it must choose by select");
  return constant.value != S(0);
}

// A constant's are computed here; the pair itself is never one.
template <class S>
SinCos<Symbol<S>> Symbol<S>::pair_of(SymbolOp op, const Symbol& a) {
  if (a.is_constant()) {
    const SinCos<S> both =
        op == SymbolOp::sine_cosine ? slipbench::sincos(a.value()) : slipbench::sincos_turns(a.value());
    return {Symbol(constant(both.sin)), Symbol(constant(both.cos))};
  }
  const SymbolNode<S> pair = record<S>(op, a.node_);
  return {Symbol(record<S>(SymbolOp::sine_of, pair)), Symbol(record<S>(SymbolOp::cosine_of, pair))};
}

#define SLIPBENCH_SYMBOL(S)                                                                                     \
  template class Graph<S>;                                                                                      \
  template bool truth_of(const SymbolNode<S>&);                                                                 \
  template SymbolNode<S> record<S>(SymbolOp, const SymbolNode<S>&, const SymbolNode<S>&, const SymbolNode<S>&); \
  template SinCos<Symbol<S>> Symbol<S>::pair_of(SymbolOp, const Symbol<S>&);
SLIPBENCH_SYMBOL(float)
SLIPBENCH_SYMBOL(double)

}  // namespace slipbench
