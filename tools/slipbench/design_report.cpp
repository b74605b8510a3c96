// What a person reads of a design: the gains, how far to trust them, what the loops do, and what a fast observer costs.
#include <fmt/format.h>

#include <cmath>

#include "tools/slipbench/design_result.hpp"
#include "tools/slipbench/linear_text.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

std::string poles(const std::vector<linear::Complex>& all) {
  std::vector<std::string> texts;
  for (const linear::Complex& p : all) texts.push_back(linear::text_of(p));
  return fmt::format("{}", fmt::join(texts, ", "));
}

std::string trust(double residual, double condition) {
  return fmt::format("  residual {}, condition {}\n", plain(residual, 2), plain(condition, 3));
}

std::string controller(const DesignResult& r) {
  const linear::StateFeedback& c = *r.controller;
  std::string out = "\nController, u = -K x" + (r.controller_from.empty() ? "" : ": " + r.controller_from) + "\n";
  out += named_table(c.K, input_names(r.plant), state_names(r.plant));
  out += "  closed-loop poles " + poles(c.poles) + "\n" + trust(c.residual, c.condition);
  if (r.integral) {
    std::vector<std::string> columns = state_names(r.plant);
    for (const Eigen::Index k : r.tracked) columns.push_back("integral of " + r.plant.output_name(k));
    out += "\nWith integral action, u = -K [x; z], z the integral of reference less output\n" +
           named_table(r.integral->K, input_names(r.plant), columns) + "  closed-loop poles " +
           poles(r.integral->poles) + "\n" + trust(r.integral->residual, r.integral->condition);
  }
  if (r.reference) {
    std::vector<std::string> columns;
    for (const Eigen::Index k : r.tracked) columns.push_back("reference of " + r.plant.output_name(k));
    out += "\nReference gain, u = -K x + N r\n" + named_table(r.reference->N, input_names(r.plant), columns) +
           fmt::format("  found directly and from the closed loop's DC gain; relative difference {}\n",
                       plain(r.reference->difference, 2));
  }
  return out;
}

std::string observer(const DesignResult& r) {
  const linear::Observer& o = *r.observer;
  return "\nObserver, gain L: " + r.observer_from + "\n" +
         named_table(o.L, state_names(r.plant), output_names(r.plant)) + "  its poles " + poles(o.poles) + "\n" +
         trust(o.residual, o.condition);
}

std::string pi(const DesignResult& r) {
  const linear::PiTuning& t = *r.pi;
  return fmt::format(
      "\nPI controller k (1 + 1/(s t_i)): k = {}, t_i = {} s{}\n"
      "  plant taken as gain {}, large lag (or integration time) {} s, small lags {} s\n"
      "  crossover {} Hz, phase margin {} deg\n",
      significant(t.gain, 6), significant(t.integral_time_s, 6),
      t.prefilter_s > 0.0 ? fmt::format("; reference through a lag of {} s", significant(t.prefilter_s, 4)) : "",
      significant(r.pi_gain, 4), significant(r.pi_large_lag_s, 4), significant(r.pi_small_lag_s, 4),
      significant(t.crossover_rad_s / 6.283185307179586, 4), significant(t.phase_margin_rad * 57.29577951308232, 4));
}

std::string responses(const DesignResult& r) {
  if (r.rows.empty()) return "";
  Table t;
  t.column("loop", "", Table::Align::left);
  t.column("output", "", Table::Align::left);
  t.column("overshoot", "%");
  t.column("rise", "s");
  t.column("settling", "s");
  t.column("steady error", "");
  t.column("peak effort", "");
  t.column("pushed", "");
  t.column("stays", "");
  t.column("noise", "");
  t.column("gain", fmt::format("at {} Hz", plain(r.at_Hz, 3)));
  t.column("phase", "deg");
  std::string not_stable;
  const auto time = [](double s) { return s < 0.0 ? std::string("-") : significant(s, 3); };
  for (const LoopRow& row : r.rows) {
    const Loop& loop = r.loops[row.loop];
    const std::string output =
        r.pi ? r.plant.output_name(0) : r.plant.output_name(r.tracked[static_cast<std::size_t>(row.pair)]);
    const auto number = [&](auto f) { return row.step ? f(*row.step) : std::string("-"); };
    t.row({loop.name, output, number([](const auto& s) { return significant(100.0 * s.overshoot, 3); }),
           number([&](const auto& s) { return time(s.rise_s); }),
           number([&](const auto& s) { return time(s.settling_s); }), number([](const auto& s) {
             return std::fabs(s.steady_error) < 1e-9 ? std::string("0") : significant(s.steady_error, 3);
           }),
           significant(row.effort, 3), significant(row.dip, 3), significant(row.left, 3), significant(row.noise, 3),
           significant(row.gain, 4), significant(row.phase_deg, 4)});
    if (!loop.stable && row.pair == 0)
      not_stable += fmt::format("  {} is not stable, so it has no step figures: {}.\n", loop.name, loop.verdict);
  }
  return "\nOne unit of reference (open loop, feedback alone: of input); pushed, stays: largest and last output after "
         "one unit of "
         "disturbance at the input;\nnoise: rms effort per unit of white noise on every output\n" +
         t.text() + not_stable;
}

std::string price(const DesignResult& r) {
  if (r.factors.empty()) return "";
  Table t;
  t.column("factor", "", Table::Align::left);
  t.column("slowest", "s");
  for (const std::string& name : state_names(r.plant)) t.column(name, "rms");
  for (const FactorRow& row : r.factors) {
    std::vector<std::string> cells = {plain(row.factor), significant(row.slowest_s, 3)};
    for (const double x : row.rms) cells.push_back(significant(x, 4));
    t.row(std::move(cells));
  }
  return fmt::format(
      "\nWhat a fast observer costs: its poles so many times further out than the controller's (2 to 5 is common "
      "practice),\nand each estimate's error per unit of white noise on every output{}\n{}",
      r.plant.discrete() ? "" : " (intensity 1 unit^2 s)", t.text());
}

}  // namespace

std::string design_report(const DesignResult& r) {
  std::string out =
      fmt::format("{}{}, order {}\n", r.title.empty() ? "" : r.title + ": ", name_of(r.kind), r.plant.order());
  if (r.pi) out += pi(r);
  if (r.is_observer()) {
    if (r.observer) out += observer(r);
    if (r.controller) out += controller(r);
  } else {
    if (r.controller) out += controller(r);
    if (r.observer) out += observer(r);
  }
  if (r.separation)
    out += fmt::format(
        "  Separation: the combined loop's poles are the controller's and the observer's, to {} relative.\n",
        plain(r.separation->distance, 2));
  out += responses(r) + price(r);
  for (const std::string& note : r.notes) out += "Note: " + note + "\n";
  for (const std::string& warning : r.warnings) out += "Warning: " + warning + "\n";
  return out;
}

}  // namespace slipbench
