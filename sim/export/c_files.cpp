// Header and source of an exported step.
#include "sim/export/c_files.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cctype>

namespace slipbench {

namespace {

constexpr const char* cautions =
    " * CAUTION. This is not a safety function, and a simulation does not replace commissioning by qualified people "
    "under\n"
    " * local codes. First trials with the power stage disconnected or the DC link current-limited, an emergency stop "
    "within\n"
    " * reach, the shaft guarded. Current, voltage and speed must be limited by something that does not depend on this "
    "code.\n";

std::string count_text(const OperationCount& o) {
  return fmt::format(
      "{} operations: {} additions and subtractions, {} multiplications, {} divisions, {} square roots, {} "
      "comparisons, {} "
      "choices, {} others",
      o.all(), o.add, o.multiply, o.divide, o.root, o.compare, o.choose, o.other);
}

std::vector<std::string> words_of(const std::string& text) {
  std::vector<std::string> words;
  std::size_t at = 0;
  while (at < text.size()) {
    const std::size_t end = std::min(text.find(' ', at), text.size());
    if (end > at) words.push_back(text.substr(at, end - at));
    at = end + 1;
  }
  return words;
}
std::string paragraph(const std::string& text) { return wrapped(words_of(text), " * "); }

template <class S>
std::string member(const std::string& name, const std::string& comment) {
  const std::string declared = fmt::format("  {} {};", c_type<S>(), name);
  return comment.empty() ? declared + "\n" : fmt::format("{:<34} /* {} */\n", declared, comment);
}

template <class S>
std::string header(const ExportedPart& part, const RecordedStep<S>& step, const ExportOrigin& o) {
  const std::string guard = upper_case(o.name) + "_H", n = o.name, in(step.in_name), out(step.out_name);
  std::string text =
      "/* " + n + ": " + o.what + " \"" + o.kind + "\" for one machine, as C99 in " + c_type<S>() + ".\n";
  text +=
      paragraph(fmt::format("Scenario {} (\"{}\"), machine as believed there: {}.", o.scenario, o.title, o.machine));
  text += fmt::format(
      " * Written by slipbench {}, export format {}. Do not edit: change the scenario and export again.\n *\n",
      o.version, export_format);
  text += cautions;
  text += " *\n * Use\n";
  text +=
      fmt::format(" *   {0}_state state;  {0}_init(&state);                       once, before the first period\n", n);
  text += fmt::format(" *   {0}_step(&state, &{1}, &{2});   every {3:.6g} us, from one context only\n *\n", n, in, out,
                      o.control_period_s * 1e6);
  text += paragraph(
      fmt::format("State: {} numbers, {} bytes; it must come from {}_init: numbers that never leave their first "
                  "value are constants in the source. A step: {}. No loop, no allocation, no branch beyond "
                  "choices (x ? a : b), no library: with the flags below no libm function is linked.",
                  part.state_numbers, part.state_bytes, n, count_text(part.operations)));
  text += " *\n * Bits are those of the simulated step (IEEE 754, round to nearest, subnormals kept) under\n";
  text += " *   -std=c99 -O2 -ffp-contract=off -fno-math-errno      (no -ffast-math; FLT_EVAL_METHOD 0)\n";
  text += paragraph(fmt::format(
      "-fno-math-errno makes sqrt{} one instruction; without it, or without -O, the bits are the same but libm is "
      "linked. {}_replay.c replays test vectors and tells whether a build keeps the bits.",
      c_suffix<S>(), n));
  text += " *\n * Units are SI, in the names. Space vectors are amplitude-invariant (peak), motor convention. */\n";
  text += fmt::format("#ifndef {0}\n#define {0}\n\n#ifdef __cplusplus\nextern \"C\" {{\n#endif\n\n", guard);

  text += "/* What is kept from one period to the next.\n";
  text += paragraph(step.state_note.empty() ? "_x and _y are parts of a vector." : std::string(step.state_note));
  text += " */\n";
  text += "typedef struct {\n";
  for (const std::string& name : step.state) text += member<S>(name, "");
  text += fmt::format("}} {}_state;\n\n/* What it sees at tick k. */\ntypedef struct {{\n", n);
  for (std::size_t i = 0; i < step.in.size(); ++i) {
    const std::string meaning(step.in[i].meaning);
    const std::string unread = step.in_read[i] ? "" : "not read";
    text += member<S>(std::string(step.in[i].member),
                      meaning.empty() || unread.empty() ? meaning + unread : meaning + "; " + unread);
  }
  text += fmt::format("}} {}_{};\n\n/* What it answers, valid at tick k. */\ntypedef struct {{\n", n, in);
  for (const DoorField& f : step.out) text += member<S>(std::string(f.member), std::string(f.meaning));
  text += fmt::format("}} {}_{};\n\n", n, out);
  text += fmt::format("#define {}_CONTROL_PERIOD_S {} /* {:.6g} */\n\n", upper_case(n),
                      c_literal(static_cast<S>(o.control_period_s)), o.control_period_s);
  text += fmt::format(
      "void {0}_init({0}_state *state);\nvoid {0}_step({0}_state *state, const {0}_{1} *{1}, {0}_{2} *{2});\n\n", n, in,
      out);
  return text + "#ifdef __cplusplus\n}\n#endif\n#endif\n";
}

// Statements that open a function read what it needs; a blank line parts them from what is computed.
template <class S>
std::string source(const RecordedStep<S>& step, const Body<S>& body, const std::string& helpers,
                   const ExportOrigin& o) {
  const std::string n = o.name, in(step.in_name), out(step.out_name);
  std::string text = "/* " + n + ": see " + n +
                     ".h. Written by slipbench; straight-line code, a heading over each block says what it computes.\n";
  text += " *\n * The numbers it was made from, in SI units:\n";
  std::vector<std::string> words;
  for (const auto& [name, value] : step.constants) words.push_back(fmt::format("{} {:.7g};", name, value));
  text += wrapped(words, " *   ");
  text += " */\n#include \"" + n + ".h\"\n\n#include <float.h>\n#include <math.h>\n";
  if (helpers.find("uint") != std::string::npos) text += "#include <stdint.h>\n";
  text +=
      "\n#ifdef __FAST_MATH__\n#error \"build without -ffast-math: the bits would not be those that were "
      "simulated\"\n#endif\n";
  text += "#if FLT_EVAL_METHOD != 0\n#error \"float and double must be evaluated in their own precision\"\n#endif\n\n";
  if (!helpers.empty())
    text += "/* Elementary functions of its own: the same bits on every processor. */\n\n" + helpers;
  if (!body.constants.empty())
    text += "/* Constants of this machine and tuning; k1, k2, ... are products that were folded. */\n" +
            body.constants + "\n";
  text += fmt::format("void {0}_init({0}_state *state) {{\n", n);
  for (std::size_t i = 0; i < step.state.size(); ++i)
    text += fmt::format("  state->{} = {};\n", step.state[i], c_literal(step.begin[i]));
  text += fmt::format("}}\n\nvoid {0}_step({0}_state *state, const {0}_{1} *{1}, {0}_{2} *{2}) {{\n", n, in, out);
  if (std::none_of(step.in_read.begin(), step.in_read.end(), [](bool read) { return read; }))
    text += "  (void)" + in + ";\n";
  return text + body.statements + "}\n";
}

}  // namespace

std::string upper_case(std::string text) {
  for (char& c : text) c = static_cast<char>(std::toupper(static_cast<unsigned char>(c)));
  return text;
}

std::string wrapped(const std::vector<std::string>& words, const std::string& lead, std::size_t width) {
  std::string text, line;
  for (const std::string& word : words) {
    if (!line.empty() && lead.size() + line.size() + 1 + word.size() > width) text += lead + line + "\n", line.clear();
    line += (line.empty() ? "" : " ") + word;
  }
  return line.empty() ? text : text + lead + line + "\n";
}

template <class S>
void write_c_files(ExportedPart& part, RecordedStep<S>& step, const DoorTraffic& traffic, const ExportOrigin& o) {
  const std::string prefix = o.name + "_";
  const Body<S> body =
      body_of(step.program, {"state", std::string(step.in_name), std::string(step.out_name)}, Constants::named, prefix);
  part.operations = body.operations;
  part.state_numbers = step.state.size(), part.state_bytes = step.state.size() * sizeof(S);
  part.files.push_back({o.name + ".h", header(part, step, o)});
  part.files.push_back({o.name + ".c", source(step, body, helper_functions<S>(body.helpers, prefix), o)});
  part.files.push_back({o.name + "_vectors.h", vectors_text(part, step, traffic, o)});
  part.files.push_back({o.name + "_replay.c", replay_text(o)});
}

template void write_c_files(ExportedPart&, RecordedStep<float>&, const DoorTraffic&, const ExportOrigin&);
template void write_c_files(ExportedPart&, RecordedStep<double>&, const DoorTraffic&, const ExportOrigin&);

}  // namespace slipbench
