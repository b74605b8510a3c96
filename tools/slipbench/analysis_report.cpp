// What a person reads of a linear system: modes, what decides, what is hidden and what that means.
#include <fmt/format.h>

#include <cmath>

#include "tools/slipbench/analysis.hpp"
#include "tools/slipbench/linear_text.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

using linear::Complex;

std::string head(const Analysis& a) {
  const linear::System& s = a.system;
  std::string out = a.title.empty() ? "" : a.title + ": ";
  out += fmt::format("{}, order {}, {} {}, {} {}, ", a.what, s.order(), s.inputs(),
                     s.inputs() == 1 ? "input" : "inputs", s.outputs(), s.outputs() == 1 ? "output" : "outputs");
  out += s.discrete() ? fmt::format("sampled every {} s\n", plain(s.sample_period_s)) : std::string("continuous\n");
  if (a.what == "state-space file" && s.state_names.empty()) return out;
  std::vector<std::string> states, inputs, outputs;
  for (Eigen::Index i = 0; i < s.order(); ++i) states.push_back(s.state_name(i));
  for (Eigen::Index i = 0; i < s.inputs(); ++i) inputs.push_back(s.input_name(i));
  for (Eigen::Index i = 0; i < s.outputs(); ++i) outputs.push_back(s.output_name(i));
  return out + fmt::format("  states {}; inputs {}; outputs {}\n", fmt::join(states, ", "), fmt::join(inputs, ", "),
                           fmt::join(outputs, ", "));
}

std::string mode_table(const Analysis& a) {
  if (a.modes.empty()) return "No states: the outputs follow the inputs at once, y = D u.\n";
  Table t;
  t.column("pole", a.system.discrete() ? "z" : "rad/s", Table::Align::left);
  t.column("damping", "");
  t.column("frequency", "Hz");
  t.column("time constant", "s");
  t.column("controllable", "", Table::Align::left);
  t.column("observable", "", Table::Align::left);
  for (std::size_t i = 0; i < a.modes.size() && i < a.tests.size(); ++i) {
    const linear::Mode& m = a.modes[i];
    const linear::ModeTest& test = a.tests[i];
    t.row({linear::text_of(m.pole), significant(m.damping, 3), significant(m.frequency_rad_s / 6.283185307179586, 4),
           significant(m.time_constant_s, 4),
           fmt::format("{} {}", test.controllable ? "yes" : "no ", plain(test.controllability, 2)),
           fmt::format("{} {}", test.observable ? "yes" : "no ", plain(test.observability, 2))});
  }
  const double tolerance = a.tests.empty() ? 0.0 : a.tests.front().tolerance;
  return "\nModes, slowest first\n" + t.text() +
         fmt::format(
             "  Numbers beside yes and no: smallest singular values of the mode tests, in balanced units; hidden below "
             "{} "
             "and how well each pole is known.\n",
             plain(tolerance, 2));
}

std::string hidden_sentences(const Analysis& a) {
  std::string out;
  const auto decays = [&](Complex p) { return a.system.discrete() ? std::abs(p) < 1.0 : p.real() < 0.0; };
  for (const linear::ModeTest& test : a.tests) {
    if (test.pole.imag() < 0.0) continue;  // with its conjugate
    const std::string mode = linear::text_of(test.pole);
    if (!test.controllable)
      out += fmt::format("  The mode at {} is moved by no input: no feedback shifts it; it {}.\n", mode,
                         decays(test.pole) ? "decays by itself" : "does not decay");
    if (!test.observable)
      out +=
          fmt::format("  The mode at {} is seen at no output: no observer corrects what it gets wrong there; it {}.\n",
                      mode, decays(test.pole) ? "forgets by itself" : "never forgets");
  }
  return out;
}

std::string structure(const Analysis& a) {
  const auto n = a.system.order();
  std::string out = fmt::format("\nVerdict: {}; {}.\n", linear::name_of(a.verdict.stability), a.verdict.why);
  out +=
      fmt::format("Controllable rank {} of {}, observable rank {} of {} (staircase, tolerance {}); minimal order {}.\n",
                  a.ranks.controllable, n, a.ranks.observable, n, plain(a.ranks.tolerance, 2), a.minimal_order());
  out += hidden_sentences(a);
  out += fmt::format("  {}: {}.\n  {}: {}.\n", a.stabilisable ? "Stabilisable" : "Not stabilisable", a.stabilisable_why,
                     a.detectable ? "Detectable" : "Not detectable", a.detectable_why);
  if (a.parts && a.minimal_order() < n) {
    out += fmt::format("  Parts: {} moved and seen, {} moved only, {} seen only, {} neither.\n",
                       a.parts->controllable_observable, a.parts->controllable_only, a.parts->observable_only,
                       a.parts->neither);
  }
  if (a.minimal) {
    for (const std::string& removed : a.minimal->removed) out += "  Not in the minimal realisation: " + removed + "\n";
  } else {
    out += "  No minimal realisation: " + a.minimal.why + "\n";
  }
  for (const linear::Redundant& r : a.redundant)
    out += fmt::format("  Redundant in the descriptor form: {}: {}\n", r.variable, r.why);
  if (a.balanced && a.balanced->hankel.size() > 0) {
    std::vector<std::string> values;
    for (const double h : a.balanced->hankel) values.push_back(plain(h, 4));
    out += fmt::format("  Hankel singular values: {}\n", fmt::join(values, ", "));
  }
  return out;
}

std::string zeros(const Analysis& a) {
  if (!a.zeros) return "No zeros: " + a.zeros.why + "\n";
  if (a.zeros->empty()) return "No finite transmission zeros.\n";
  std::vector<std::string> names;
  std::string late;
  for (const Complex& z : *a.zeros) {
    names.push_back(linear::text_of(z));
    const bool outside = a.system.discrete() ? std::abs(z) > 1.0 : z.real() > 0.0;
    if (outside && z.imag() >= 0.0)
      late += fmt::format(
          "  The zero at {} is not minimum-phase: fast control pays for it with undershoot, high gain ends there.\n",
          linear::text_of(z));
  }
  return fmt::format("Transmission zeros: {}\n{}", fmt::join(names, ", "), late);
}

std::string discretisations(const Analysis& a) {
  if (a.discretised.empty()) return "";
  Table t;
  t.column("method", "", Table::Align::left);
  t.column("to 1/10 Nyquist", "%");
  t.column("to 1/2 Nyquist", "%");
  t.column("pole error", "");
  std::string refused, warned;
  double period = 0.0;
  for (const auto& d : a.discretised) {
    if (!d) {
      refused += "  " + d.why + "\n";
      continue;
    }
    period = d->period_s;
    t.row({linear::name_of(d->method), significant(100.0 * d->error.response_to_tenth, 3),
           significant(100.0 * d->error.response_to_half, 3), plain(d->error.pole, 3)});
    if (!d->error.warning.empty()) warned += fmt::format("  {}: {}\n", linear::name_of(d->method), d->error.warning);
  }
  return fmt::format("\nDiscretised at {} s: worst error of the frequency response\n{}{}{}", plain(period), t.text(),
                     warned, refused);
}

}  // namespace

std::string analysis_report(const Analysis& a) {
  std::string out = head(a);
  if (!a.operating_point.empty()) {
    Table t;
    t.column("", "", Table::Align::left);
    t.column("", "");
    for (const OperatingValue& v : a.operating_point) t.row({v.column, significant(v.value, 5)});
    out += "\nOperating point\n" + t.text();
  }
  out += mode_table(a) + structure(a) + zeros(a);
  if (a.dc_gain) {
    if (a.dc_gain->size() > 0) out += "\nDC gain\n" + matrix_table(*a.dc_gain, a.system);
  } else {
    out += "No DC gain: " + a.dc_gain.why + "\n";
  }
  if (a.at_Hz > 0.0) {
    out += a.at ? fmt::format("\nAt {} Hz\n{}", plain(a.at_Hz), gain_phase_table(*a.at, a.system))
                : fmt::format("\nAt {} Hz: {}\n", plain(a.at_Hz), a.at.why);
  }
  out += discretisations(a);
  for (const std::string& warning : a.warnings) out += "Warning: " + warning + "\n";
  return out;
}

}  // namespace slipbench
