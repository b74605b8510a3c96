// The elementary functions as C99: written down from the very templates of elementary.hpp.
#include <sstream>

#include "plant/math/elementary.hpp"
#include "plant/math/symbol_text.hpp"

namespace slipbench {

namespace {

// What differs between the emitted precisions.
template <class S>
struct C;
template <>
struct C<float> {
  static constexpr const char *word = "uint32_t", *shift = "23", *one_word = "UINT32_C", *exponent_bits = "0x4b000000",
                              *exponent_offset = "0x1.0000fep+23f", *whole = "0x1p+23f";
};
template <>
struct C<double> {
  static constexpr const char *word = "uint64_t", *shift = "52", *one_word = "UINT64_C",
                              *exponent_bits = "0x4330000000000000", *exponent_offset = "0x1.00000000003ffp+52",
                              *whole = "0x1p+52";
};

bool is_primitive(SymbolOp op) {
  return op == SymbolOp::minimum || op == SymbolOp::maximum || op == SymbolOp::limit || op == SymbolOp::floor ||
         op == SymbolOp::two_to_the || op == SymbolOp::exponent_of;
}
bool is_pair(SymbolOp op) { return op == SymbolOp::sine_cosine || op == SymbolOp::sine_cosine_turns; }

// By the same comparisons and bit operations as numbers.hpp and elementary.hpp; floor as adding and taking away 2^23 (2^52),
// which leaves no room for a fraction.
template <class S>
std::string primitive(SymbolOp op, const std::string& prefix) {
  const std::string T = c_type<S>(), f = c_suffix<S>(), head = "static " + T + " " + helper_name<S>(op, prefix) + "(";
  const std::string x = T + " x) {\n", bits = "  union { " + T + " number; " + C<S>::word + " bits; } u;\n";
  switch (op) {
    case SymbolOp::minimum:
      return head + T + " a, " + T + " b) {\n  return b < a ? b : a;\n}\n";
    case SymbolOp::maximum:
      return head + T + " a, " + T + " b) {\n  return a < b ? b : a;\n}\n";
    case SymbolOp::limit:
      return head + T + " x, " + T + " low, " + T + " high) {\n  const " + T +
             " raised = x < low ? low : x;\n  return high < raised ? high : raised;\n}\n";
    case SymbolOp::floor:
      return head + x + "  const " + T + " whole = " + C<S>::whole +
             "; /* from here on every number is whole */\n  const " + T +
             " up = (x + whole) - whole, down = (x - whole) + whole;\n  const " + T + " nearest = x < 0.0" + f +
             " ? down : up;\n  const " + T + " below = nearest > x ? nearest - 1.0" + f +
             " : nearest;\n  return ((fabs" + f + "(x) < whole) & (below != x)) ? below : x;\n}\n";
    case SymbolOp::two_to_the:
      return head + x + bits + "  u.number = x + " + C<S>::exponent_offset + ";\n  u.bits <<= " + C<S>::shift +
             ";\n  return u.number;\n}\n";
    default:
      return head + x + bits + "  u.number = x;\n  u.bits = (u.bits >> " + C<S>::shift + ") | " + C<S>::one_word + "(" +
             C<S>::exponent_bits + ");\n  return u.number - " + C<S>::exponent_offset + ";\n}\n";
  }
}

const char* what_it_gives(SymbolOp op) {
  switch (op) {
    case SymbolOp::sine_cosine:
      return "sine and cosine of an angle in rad: quarters of a turn taken off in parts, then polynomials";
    case SymbolOp::sine_cosine_turns:
      return "sine and cosine of an angle in turns";
    case SymbolOp::arctangent:
      return "angle of (x, y) in (-pi, pi] rad; 0 for (0, 0)";
    case SymbolOp::exponential:
      return "e^x";
    case SymbolOp::logarithm:
      return "natural logarithm";
    default:
      return "an angle in rad taken into [-pi, pi)";
  }
}

template <class S>
Program<S> recorded(SymbolOp op) {
  using R = Symbol<S>;
  Program<S> p;
  const typename Program<S>::Listening listening(p);
  const bool two = op == SymbolOp::arctangent;
  const R y = two ? p.input_at("y", "y") : R(), x = p.input_at("x", "x");
  if (is_pair(op)) {
    const SinCos<R> both = op == SymbolOp::sine_cosine ? slipbench::sincos<R>(x) : slipbench::sincos_turns<R>(x);
    p.output_at("both.sin", "sine", both.sin);
    p.output_at("both.cos", "cosine", both.cos);
    return p;
  }
  p.output_at("return", "result",
              two                           ? slipbench::atan2<R>(y, x)
              : op == SymbolOp::exponential ? slipbench::exp<R>(x)
              : op == SymbolOp::logarithm   ? slipbench::log<R>(x)
                                            : slipbench::wrap_angle<R>(x));
  return p;
}

template <class S>
Body<S> composite(SymbolOp op, const std::string& prefix) {
  return body_of(recorded<S>(op), {"both"}, Constants::inlined, prefix);
}

}  // namespace

template <class S>
std::string helper_name(SymbolOp op, const std::string& prefix) {
  switch (op) {
    case SymbolOp::minimum:
      return prefix + "min";
    case SymbolOp::maximum:
      return prefix + "max";
    case SymbolOp::limit:
      return prefix + "clamp";
    case SymbolOp::floor:
      return prefix + "floor";
    case SymbolOp::two_to_the:
      return prefix + "two_to_the";
    case SymbolOp::exponent_of:
      return prefix + "exponent_of";
    case SymbolOp::sine_cosine:
      return prefix + "sincos";
    case SymbolOp::sine_cosine_turns:
      return prefix + "sincos_turns";
    case SymbolOp::arctangent:
      return prefix + "atan2";
    case SymbolOp::exponential:
      return prefix + "exp";
    case SymbolOp::logarithm:
      return prefix + "log";
    case SymbolOp::wrapped:
      return prefix + "wrap_angle";
    default:
      return {};
  }
}

template <class S>
std::string helper_functions(const std::set<SymbolOp>& wanted, const std::string& prefix) {
  std::set<SymbolOp> all = wanted;
  std::ostringstream composites, primitives;
  bool pairs = false;
  for (const SymbolOp op : wanted) {
    if (is_primitive(op)) continue;
    const Body<S> body = composite<S>(op, prefix);
    all.insert(body.helpers.begin(), body.helpers.end());
    pairs = pairs || is_pair(op);
    const std::string T = c_type<S>(), returned = is_pair(op) ? prefix + "sin_cos" : T;
    const std::string parameters = op == SymbolOp::arctangent ? T + " y, " + T + " x" : T + " x";
    composites << "/* " << what_it_gives(op) << " */\nstatic " << returned << " " << helper_name<S>(op, prefix) << "("
               << parameters << ") {\n"
               << (is_pair(op) ? "  " + returned + " both;\n" : "") << body.statements
               << (is_pair(op) ? "  return both;\n" : "") << "}\n\n";
  }
  for (const SymbolOp op : all) {
    if (is_primitive(op)) primitives << primitive<S>(op, prefix) << "\n";
  }
  if (pairs) primitives << "typedef struct {\n  " << c_type<S>() << " sin, cos;\n} " << prefix << "sin_cos;\n\n";
  return primitives.str() + composites.str();
}

template <class S>
OperationCount operations_of_helper(SymbolOp op) {
  if (!is_primitive(op)) return composite<S>(op, "").operations;
  OperationCount o;
  if (op == SymbolOp::minimum || op == SymbolOp::maximum) o.compare = o.choose = 1;
  if (op == SymbolOp::limit) o.compare = o.choose = 2;
  if (op == SymbolOp::floor) o.add = 5, o.compare = 4, o.choose = 3, o.other = 2;
  if (op == SymbolOp::two_to_the) o.add = 1, o.other = 1;
  if (op == SymbolOp::exponent_of) o.add = 1, o.other = 2;
  return o;
}

#define SLIPBENCH_HELPERS(S)                                                               \
  template std::string helper_name<S>(SymbolOp, const std::string&);                       \
  template std::string helper_functions<S>(const std::set<SymbolOp>&, const std::string&); \
  template OperationCount operations_of_helper<S>(SymbolOp);
SLIPBENCH_HELPERS(float)
SLIPBENCH_HELPERS(double)

}  // namespace slipbench
