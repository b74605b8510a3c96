// Body of a C99 function from a recorded program: one pass over its nodes in the order in which they were recorded.
#include "plant/math/symbol_text.hpp"

#include <algorithm>
#include <cstdio>

namespace slipbench {

namespace {

constexpr std::size_t longest_inside = 64, longest_line = 92;

bool is_mask(SymbolOp op) { return op >= SymbolOp::truth; }
bool is_leaf(SymbolOp op) { return op == SymbolOp::constant || op == SymbolOp::input || op == SymbolOp::truth; }
bool is_pair(SymbolOp op) { return op == SymbolOp::sine_cosine || op == SymbolOp::sine_cosine_turns; }

template <class S>
class Writer {
  // How tightly C binds an expression; `name` binds tightest.
  enum Binding { choice, either_of, both_of, equality, comparison, sum, product, sign, name };

  struct Text {
    std::string text;
    Binding binding = name;
    bool inside = false;  // stands where it is used, has no statement of its own
  };

 public:
  Writer(const Program<S>& program, std::set<std::string> taken, Constants constants, const std::string& prefix)
      : program_(program),
        graph_(program.graph()),
        need_(program.needed()),
        uses_(graph_.nodes.size()),
        text_(graph_.nodes.size()),
        taken_(std::move(taken)),
        constants_(constants),
        prefix_(prefix) {
    for (const char* word : {"NAN", "INFINITY", "sqrt", "floor", "fabs", "sqrtf", "floorf", "fabsf"})
      taken_.insert(word);
  }

  Body<S> write() {
    count_uses();
    reserve_names();
    for (std::uint32_t i = 0; i < need_.size(); ++i) {
      if (need_[i]) visit(i);
    }
    if (!graph_.sections.empty()) line("\n  /* kept for the next call, and answered */");
    for (const auto& port : program_.written()) {
      const std::string value = port.node.graph ? text_[port.node.id].text : constant_text(port.node);
      line("  " + port.place + (port.place == "return" ? " " : " = ") + value + ";");
    }
    return std::move(body_);
  }

 private:
  void line(const std::string& text) { body_.statements += text + "\n"; }

  void count_uses() {
    for (std::size_t i = 0; i < need_.size(); ++i) {
      if (!need_[i]) continue;
      const auto& n = graph_.nodes[i];
      const std::uint32_t operands[] = {n.a, n.b, n.c};
      for (std::size_t k = 0; k < operand_count(n.op); ++k) ++uses_[operands[k]];
    }
    for (const auto& port : program_.written()) {
      if (port.node.graph) ++uses_[port.node.id];
    }
  }

  std::string free_name(const std::string& wanted) {
    const std::string base = c_identifier(wanted);
    std::string candidate = base;
    for (int n = 2; !taken_.insert(candidate).second; ++n) candidate = base + "_" + std::to_string(n);
    return candidate;
  }
  // Names that were given are kept free from those made up here.
  void reserve_names() {
    for (const auto& [id, label] : graph_.labels) {
      if (need_[id]) given_[id] = free_name(label);
    }
    for (const auto& port : program_.written()) {
      if (port.node.graph && !is_leaf(graph_.nodes[port.node.id].op) && uses_[port.node.id] > 1 &&
          !given_.contains(port.node.id))
        given_[port.node.id] = free_name(port.name);
    }
  }

  static bool simple(S value) {
    const S scaled = value * S(64.0);
    return value == value && fabs(value) <= S(4096.0) && floor(scaled) == scaled;
  }

  std::string constant_text(const SymbolNode<S>& n) { return constant_text(n.value, n.origin ? *n.origin : ""); }
  // A constant's declaration comes with its first use; the negative of a named one is written as such.
  std::string constant_text(S value, const std::string& origin) {
    if (constants_ == Constants::inlined || simple(value) || value - value != S(0)) return c_literal(value);
    if (origin.size() > 1 && origin[0] == '-' && is_name(origin.substr(1)))
      return "-" + constant_text(-value, origin.substr(1));
    std::string& identifier = declared_[origin.empty() ? c_literal(value) : origin];
    if (!identifier.empty()) return identifier;
    identifier = free_name(is_name(origin) ? origin : "k" + std::to_string(++unnamed_));
    char decimal[40];
    std::snprintf(decimal, sizeof decimal, "%.7g", static_cast<double>(value));
    body_.constants += std::string("static const ") + c_type<S>() + " " + identifier + " = " + c_literal(value) +
                       "; /* " + decimal + (is_name(origin) || origin.empty() ? "" : " = " + origin) + " */\n";
    return identifier;
  }
  static bool is_name(const std::string& origin) {
    return !origin.empty() && origin[0] != '-' && origin.find_first_of(" (") == std::string::npos;
  }

  // The heading in whose range the node was recorded, once, when its first statement comes.
  void heading(std::uint32_t i) {
    const auto& all = graph_.sections;
    const auto next =
        std::upper_bound(all.begin(), all.end(), i, [](std::uint32_t id, const auto& s) { return id < s.first; });
    const auto at = next - all.begin();
    if (at == headed_) return;
    headed_ = at;
    if (at > 0) line("\n  /* " + all[static_cast<std::size_t>(at - 1)].second + " */");
  }

  void state(std::uint32_t i) {
    if (reading_) line("");
    reading_ = false;
    heading(recording_);
    const SymbolOp op = graph_.nodes[i].op;
    const auto given = given_.find(i);
    const std::string identifier = given != given_.end() ? given->second
                                   : is_pair(op)
                                       ? free_name("turned")
                                       : free_name((is_mask(op) ? "m" : "t") + std::to_string(++temporaries_));
    const std::string type = is_pair(op) ? prefix_ + "sin_cos" : is_mask(op) ? "int" : c_type<S>();
    line("  const " + type + " " + identifier + " = " + text_[i].text + ";");
    text_[i] = {identifier, name, false};
  }

  void visit(std::uint32_t i) {
    const auto& n = graph_.nodes[i];
    recording_ = i;
    const auto given = given_.find(i);
    const std::string own = given == given_.end() ? "" : given->second;
    if (n.op == SymbolOp::truth) {
      text_[i] = {n.value != S(0) ? "1" : "0", name, false};
    } else if (n.op == SymbolOp::constant) {
      const auto origin = graph_.origins.find(i);
      const std::string text = constant_text(n.value, origin == graph_.origins.end() ? "" : origin->second);
      text_[i] = {text, text[0] == '-' || text[0] == '(' ? sign : name, false};
    } else if (n.op == SymbolOp::input) {
      text_[i] = {own, name, false};
      const std::string& place = program_.read()[n.a].place;
      if (place == own) return;
      line("  const " + std::string(c_type<S>()) + " " + own + " = " + place + ";");
      reading_ = true;
    } else {
      count(n.op);
      text_[i] = expression(n);
      const bool trivial =
          (n.op == SymbolOp::negate && !text_[n.a].inside) || n.op == SymbolOp::sine_of || n.op == SymbolOp::cosine_of;
      if (!own.empty() || is_pair(n.op) || (uses_[i] > 1 && !trivial) || text_[i].text.size() > longest_inside)
        state(i);
    }
  }

  // The operand's text, in parentheses where it binds less tightly than `least`; of three, the longest gets a statement of
  // its own while the line would be too long.
  std::string operand(std::uint32_t i, Binding least) const {
    const Text& t = text_[i];
    return t.binding < least ? "(" + t.text + ")" : t.text;
  }
  void shorten(const typename Graph<S>::Node& n) {
    const std::uint32_t operands[] = {n.a, n.b, n.c};
    const std::size_t count = operand_count(n.op);
    for (;;) {
      std::size_t length = 0, longest = count;
      for (std::size_t k = 0; k < count; ++k) {
        length += text_[operands[k]].text.size();
        if (text_[operands[k]].inside &&
            (longest == count || text_[operands[k]].text.size() > text_[operands[longest]].text.size()))
          longest = k;
      }
      if (length <= longest_line || longest == count) return;
      state(operands[longest]);
    }
  }

  Text expression(const typename Graph<S>::Node& n) {
    shorten(n);
    const auto infix = [&](const char* op, Binding binding) {
      return Text{operand(n.a, binding) + op + operand(n.b, static_cast<Binding>(binding + 1)), binding, true};
    };
    const auto call = [&](const std::string& function) {
      std::string text = function + "(" + text_[n.a].text;
      if (operand_count(n.op) > 1) text += ", " + text_[n.b].text;
      if (operand_count(n.op) > 2) text += ", " + text_[n.c].text;
      return Text{text + ")", name, true};
    };
    switch (n.op) {
      case SymbolOp::add:
        if (graph_.nodes[n.b].op == SymbolOp::constant && text_[n.b].text[0] == '-')  // the same to the bit
          return Text{operand(n.a, sum) + " - " + text_[n.b].text.substr(1), sum, true};
        return infix(" + ", sum);
      case SymbolOp::subtract:
        return infix(" - ", sum);
      case SymbolOp::multiply:
        return infix(" * ", product);
      case SymbolOp::divide:
        return infix(" / ", product);
      case SymbolOp::negate:
        return {"-" + operand(n.a, name), sign, true};
      case SymbolOp::root:
        return call(std::string("sqrt") + c_suffix<S>());
      case SymbolOp::size:
        return call(std::string("fabs") + c_suffix<S>());
      case SymbolOp::sine_of:
        return {text_[n.a].text + ".sin", name, true};
      case SymbolOp::cosine_of:
        return {text_[n.a].text + ".cos", name, true};
      case SymbolOp::select:
        return {operand(n.a, name) + " ? " + operand(n.b, sum) + " : " + operand(n.c, sum), choice, true};
      case SymbolOp::less:
        return infix(" < ", comparison);
      case SymbolOp::less_equal:
        return infix(" <= ", comparison);
      case SymbolOp::equal:
        return infix(" == ", equality);
      case SymbolOp::both:
        return {operand(n.a, name) + " & " + operand(n.b, name), both_of, true};
      case SymbolOp::either:
        return {operand(n.a, name) + " | " + operand(n.b, name), either_of, true};
      case SymbolOp::opposite:
        return {"!" + operand(n.a, name), sign, true};
      default:
        body_.helpers.insert(n.op);
        return call(helper_name<S>(n.op, prefix_));
    }
  }

  void count(SymbolOp op) {
    OperationCount& o = body_.operations;
    switch (op) {
      case SymbolOp::add:
      case SymbolOp::subtract:
        ++o.add;
        break;
      case SymbolOp::multiply:
        ++o.multiply;
        break;
      case SymbolOp::divide:
        ++o.divide;
        break;
      case SymbolOp::root:
        ++o.root;
        break;
      case SymbolOp::select:
        ++o.choose;
        break;
      case SymbolOp::less:
      case SymbolOp::less_equal:
      case SymbolOp::equal:
        ++o.compare;
        break;
      case SymbolOp::sine_of:
      case SymbolOp::cosine_of:
        break;
      case SymbolOp::negate:
      case SymbolOp::size:
      case SymbolOp::both:
      case SymbolOp::either:
      case SymbolOp::opposite:
        ++o.other;
        break;
      default:
        o.include(operations_of_helper<S>(op));
    }
  }

  const Program<S>& program_;
  const Graph<S>& graph_;
  std::vector<bool> need_;
  std::vector<std::size_t> uses_;
  std::vector<Text> text_;
  std::set<std::string> taken_;
  std::map<std::uint32_t, std::string> given_;
  std::map<std::string, std::string> declared_;  // constants, by origin or value
  Constants constants_;
  std::string prefix_;
  Body<S> body_;
  std::uint32_t recording_ = 0;
  bool reading_ = false;  // the last lines read inputs
  std::ptrdiff_t headed_ = 0;
  int temporaries_ = 0, unnamed_ = 0;
};

}  // namespace

void OperationCount::include(const OperationCount& more) {
  add += more.add, multiply += more.multiply, divide += more.divide, root += more.root;
  compare += more.compare, choose += more.choose, other += more.other;
}

template <class S>
Body<S> body_of(const Program<S>& program, std::set<std::string> taken, Constants constants,
                const std::string& prefix) {
  return Writer<S>(program, std::move(taken), constants, prefix).write();
}

template <>
const char* c_type<float>() {
  return "float";
}
template <>
const char* c_type<double>() {
  return "double";
}
template <>
const char* c_suffix<float>() {
  return "f";
}
template <>
const char* c_suffix<double>() {
  return "";
}

template <class S>
std::string c_literal(S value) {
  const std::string cast = std::string("(") + c_type<S>() + ")";
  if (value != value) return cast + "NAN";
  if (value - value != S(0)) return value > S(0) ? cast + "INFINITY" : "-" + cast + "INFINITY";
  const S scaled = value * S(64.0);
  const bool simple = fabs(value) <= S(4096.0) && floor(scaled) == scaled;
  char text[40];
  std::snprintf(text, sizeof text, simple ? "%.10g" : "%a", static_cast<double>(value));
  const bool bare = simple && std::string(text).find('.') == std::string::npos;
  return text + std::string(bare ? ".0" : "") + c_suffix<S>();
}

std::string c_identifier(std::string name) {
  static const std::set<std::string> reserved{
      "auto",   "break",    "case",     "char",     "const", "continue", "default", "do",     "double",
      "else",   "enum",     "extern",   "float",    "for",   "goto",     "if",      "inline", "int",
      "long",   "register", "restrict", "return",   "short", "signed",   "sizeof",  "static", "struct",
      "switch", "typedef",  "union",    "unsigned", "void",  "volatile", "while",   "main"};
  for (char& c : name) {
    const bool fits = (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '_';
    if (!fits) c = '_';
  }
  if (name.empty() || (name[0] >= '0' && name[0] <= '9')) name = "x" + name;
  return reserved.contains(name) ? name + "_2" : name;
}

template Body<float> body_of(const Program<float>&, std::set<std::string>, Constants, const std::string&);
template Body<double> body_of(const Program<double>&, std::set<std::string>, Constants, const std::string&);
template std::string c_literal(float);
template std::string c_literal(double);

}  // namespace slipbench
