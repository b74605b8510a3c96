// Program<Scalar>::emit_c: the recorded graph as one straight-line C99 function, one statement a node.
#include <algorithm>
#include <cstdio>
#include <set>
#include <sstream>

#include "plant/math/symbol.hpp"

namespace slipbench {

namespace {

// What differs between the emitted precisions.
template <class S>
struct C;
template <>
struct C<float> {
  static constexpr const char *type = "float", *word = "uint32_t", *suffix = "f", *shift = "23", *one_word = "UINT32_C",
                              *exponent_bits = "0x4b000000", *exponent_offset = "0x1.0000fep+23";
};
template <>
struct C<double> {
  static constexpr const char *type = "double", *word = "uint64_t", *suffix = "", *shift = "52", *one_word = "UINT64_C",
                              *exponent_bits = "0x4330000000000000", *exponent_offset = "0x1.00000000003ffp+52";
};

template <class S>
std::string literal(S value) {
  const std::string cast = std::string("(") + C<S>::type + ")";
  if (value != value) return cast + "NAN";
  if (value - value != S(0)) return value > S(0) ? cast + "INFINITY" : "-" + cast + "INFINITY";
  char text[40];
  std::snprintf(text, sizeof text, "%a", static_cast<double>(value));
  return text + std::string(C<S>::suffix);
}

template <class S>
const char* helper(SymbolOp op) {
  return op == SymbolOp::two_to_the ? "slipbench_two_to_the" : "slipbench_exponent_of";
}

// The two exponent primitives of plant/math/elementary.hpp, by the same bit operations.
template <class S>
void emit_helper(std::ostream& out, SymbolOp op) {
  out << "static " << C<S>::type << " " << helper<S>(op) << "(" << C<S>::type << " x) {\n  union { " << C<S>::type
      << " number; " << C<S>::word << " bits; } u;\n";
  if (op == SymbolOp::two_to_the) {
    out << "  u.number = x + " << C<S>::exponent_offset << C<S>::suffix << ";\n  u.bits <<= " << C<S>::shift
        << ";\n  return u.number;\n}\n";
  } else {
    out << "  u.number = x;\n  u.bits = (u.bits >> " << C<S>::shift << ") | " << C<S>::one_word << "("
        << C<S>::exponent_bits << ");\n  return u.number - " << C<S>::exponent_offset << C<S>::suffix << ";\n}\n";
  }
}

template <class S>
std::string expression(const typename Graph<S>::Node& n, const std::vector<std::string>& name) {
  const std::string call = C<S>::suffix;
  const auto a = [&] { return name[n.a]; };
  const auto infix = [&](const char* sign) { return name[n.a] + sign + name[n.b]; };
  switch (n.op) {
    case SymbolOp::add:
      return infix(" + ");
    case SymbolOp::subtract:
      return infix(" - ");
    case SymbolOp::multiply:
      return infix(" * ");
    case SymbolOp::divide:
      return infix(" / ");
    case SymbolOp::negate:
      return "-" + a();
    case SymbolOp::root:
      return "sqrt" + call + "(" + a() + ")";
    case SymbolOp::floor:
      return "floor" + call + "(" + a() + ")";
    case SymbolOp::size:
      return "fabs" + call + "(" + a() + ")";
    case SymbolOp::two_to_the:
    case SymbolOp::exponent_of:
      return helper<S>(n.op) + ("(" + a() + ")");
    case SymbolOp::select:
      return a() + " ? " + name[n.b] + " : " + name[n.c];
    case SymbolOp::less:
      return infix(" < ");
    case SymbolOp::less_equal:
      return infix(" <= ");
    case SymbolOp::equal:
      return infix(" == ");
    case SymbolOp::both:
      return infix(" & ");
    case SymbolOp::either:
      return infix(" | ");
    case SymbolOp::opposite:
      return "!" + a();
    case SymbolOp::constant:
    case SymbolOp::input:
    case SymbolOp::truth:
      break;
  }
  return {};
}

bool is_mask(SymbolOp op) { return op >= SymbolOp::truth; }
bool is_leaf(SymbolOp op) { return op == SymbolOp::constant || op == SymbolOp::input || op == SymbolOp::truth; }

}  // namespace

// An identifier nobody else has: not C's, not ours, not given before.
template <class S>
std::string Program<S>::unique(std::string name) {
  static const std::set<std::string> reserved{
      "auto",   "break",    "case",     "char",     "const", "continue", "default", "do",     "double",
      "else",   "enum",     "extern",   "float",    "for",   "goto",     "if",      "inline", "int",
      "long",   "register", "restrict", "return",   "short", "signed",   "sizeof",  "static", "struct",
      "switch", "typedef",  "union",    "unsigned", "void",  "volatile", "while"};
  for (char& c : name) {
    const bool fits = (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '_';
    if (!fits) c = '_';
  }
  if (name.empty() || (name[0] >= '0' && name[0] <= '9')) name = "x" + name;
  std::string candidate = name;
  while (reserved.count(candidate) || taken_.count(candidate))
    candidate = name + "_" + std::to_string(++taken_[name] + 1);
  taken_[candidate];
  return candidate;
}

template <class S>
std::string Program<S>::emit_c(const std::string& function_name) const {
  const auto& nodes = graph_->nodes;
  const auto need = needed();

  struct Array {
    std::string name;
    std::size_t size = 0;
    bool written = false;
  };
  std::vector<Array> arrays;
  const auto declare = [&](const Port& port, bool written) {
    Array* array = nullptr;
    for (auto& known : arrays) array = known.name == port.array ? &known : array;
    if (!array) array = &arrays.emplace_back(Array{port.array});
    array->size = std::max(array->size, port.element + 1);
    array->written = array->written || written;
  };
  for (const auto& port : inputs_) declare(port, false);
  for (const auto& port : outputs_) declare(port, true);

  // Parameters keep their names; whatever would clash gets underscores.
  std::set<std::string> used{function_name, "NAN", "INFINITY", "sqrt", "floor", "fabs", "sqrtf", "floorf", "fabsf"};
  for (const auto& array : arrays) used.insert(array.name);
  const auto free_name = [&](std::string wanted) {
    while (!used.insert(wanted).second) wanted += '_';
    return wanted;
  };
  std::vector<std::string> name(nodes.size());
  std::size_t temporaries = 0;
  for (std::size_t i = 0; i < nodes.size(); ++i) {
    const auto given = names_.find(static_cast<std::uint32_t>(i));
    if (need[i] && given != names_.end()) name[i] = free_name(given->second);
  }
  for (std::size_t i = 0; i < nodes.size(); ++i) {
    if (!need[i] || !name[i].empty()) continue;
    if (nodes[i].op == SymbolOp::constant)
      name[i] = literal(nodes[i].value);
    else if (nodes[i].op == SymbolOp::truth)
      name[i] = nodes[i].value != S(0) ? "1" : "0";
    else
      name[i] = free_name((is_mask(nodes[i].op) ? "m" : "t") + std::to_string(++temporaries));
    if (name[i][0] == '-') name[i] = "(" + name[i] + ")";
  }

  std::ostringstream out;
  const auto counts = operation_counts();
  const auto count = [&](SymbolOp op) { return counts.count(op) ? counts.at(op) : std::size_t{0}; };
  out << "/* " << function_name << ": straight-line C99 in " << C<S>::type << ", written by slipbench.\n"
      << " * " << count(SymbolOp::multiply) << " multiplications, " << count(SymbolOp::add) << " additions, "
      << count(SymbolOp::subtract) << " subtractions, " << count(SymbolOp::divide) << " divisions, "
      << count(SymbolOp::root) << " square roots.\n"
      << " * Its bits are those of the simulation under IEEE 754 arithmetic, rounding to nearest, subnormals kept, and "
         "these flags:\n"
      << " *   -std=c99 -ffp-contract=off   (no -ffast-math, no -funsafe-math-optimizations, FLT_EVAL_METHOD 0)\n"
      << " * Every input is read before any output is written, so arrays may be the same memory. */\n"
      << "#include <math.h>\n#include <stdint.h>\n\n";
  for (SymbolOp op : {SymbolOp::two_to_the, SymbolOp::exponent_of}) {
    if (count(op)) emit_helper<S>(out, op), out << "\n";
  }
  std::string signature = "void " + function_name + "(";
  for (std::size_t i = 0; i < arrays.size(); ++i) {
    signature += (i ? ", " : "") + std::string(arrays[i].written ? "" : "const ") + C<S>::type + " " + arrays[i].name +
                 "[" + std::to_string(arrays[i].size) + "]";
  }
  signature += arrays.empty() ? "void)" : ")";
  out << signature << ";\n\n" << signature << " {\n";
  for (const auto& port : inputs_) {
    if (!need[port.node.id]) {
      out << "  /* " << port.array << "[" << port.element << "]: " << port.name << ", not needed */\n";
      continue;
    }
    out << "  const " << C<S>::type << " " << name[port.node.id] << " = " << port.array << "[" << port.element
        << "];\n";
  }
  for (const auto& array : arrays) {
    bool used = array.written;
    for (const auto& port : inputs_) used = used || (port.array == array.name && need[port.node.id]);
    if (!used) out << "  (void)" << array.name << ";\n";
  }
  for (std::size_t i = 0; i < nodes.size(); ++i) {
    if (!need[i] || is_leaf(nodes[i].op)) continue;
    out << "  const " << (is_mask(nodes[i].op) ? "int" : C<S>::type) << " " << name[i] << " = "
        << expression<S>(nodes[i], name) << ";\n";
  }
  for (const auto& port : outputs_) {
    out << "  " << port.array << "[" << port.element
        << "] = " << (port.node.graph ? name[port.node.id] : literal(port.node.value)) << ";  /* " << port.name
        << " */\n";
  }
  out << "}\n";
  return out.str();
}

template std::string Program<float>::unique(std::string);
template std::string Program<double>::unique(std::string);
template std::string Program<float>::emit_c(const std::string&) const;
template std::string Program<double>::emit_c(const std::string&) const;

}  // namespace slipbench
