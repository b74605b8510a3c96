// The tables of a comparison as text.
#include <fmt/format.h>

#include "sim/scenario/scenario.hpp"
#include "tools/slipbench/comparison.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

std::string cell(const Interval& interval) {
  if (!interval.mean) return "-";
  return interval.high ? plus_minus(*interval.mean, *interval.high - *interval.mean) : significant(interval.mean);
}

std::string figures_text(const Comparison& c) {
  Table table;
  table.column("estimator", "", Table::Align::left);
  std::vector<std::size_t> shown;
  const auto add = [&](const char* heading, const char* name, const char* unit) {
    table.column(heading, unit);
    shown.push_back(c.figure(name));
  };
  add("speed rms", "speed_rmse_rpm", "rpm");
  add("bias", "speed_bias_rpm", "rpm");
  add("largest", "speed_max_error_rpm", "rpm");
  add("angle rms", "angle_rmse_deg", "deg");
  add("torque rms", "torque_rmse_Nm", "N m");
  if (c.in_loop) {
    add("tracking rms", "speed_tracking_rmse_rpm", "rpm");
    add("load dip", "load_dip_rpm", "rpm");
  }
  table.column("lost", "runs");
  for (std::size_t e = 0; e < c.estimators.size(); ++e) {
    std::vector<std::string> cells = {c.estimators[e].name};
    for (const std::size_t figure : shown) cells.push_back(cell(c.interval(e, figure)));
    cells.push_back(fmt::format("{} of {}", c.estimators[e].lost_runs(), c.runs()));
    table.row(std::move(cells));
  }
  return table.text();
}

std::string differences_text(const Comparison& c) {
  Table table;
  table.column("pair", "", Table::Align::left);
  table.column("difference", "rpm");
  table.column("from", "rpm");
  table.column("to", "rpm");
  table.column("reading", "", Table::Align::left);
  const std::size_t figure = c.figure("speed_rmse_rpm");
  for (std::size_t a = 0; a < c.estimators.size(); ++a) {
    for (std::size_t b = a + 1; b < c.estimators.size(); ++b) {
      const Interval d = c.difference(a, b, figure);
      std::string reading = "too few runs";
      if (d.low) reading = "no difference shown";
      if (d.excludes_zero()) reading = fmt::format("{} is better", c.estimators[*d.mean < 0.0 ? a : b].name);
      table.row({fmt::format("{} - {}", c.estimators[a].name, c.estimators[b].name), significant(d.mean, 3),
                 significant(d.low, 3), significant(d.high, 3), reading});
    }
  }
  return table.text();
}

}  // namespace

std::string comparison_summary(const Comparison& c, const Scenario& scenario, const std::vector<std::string>& files) {
  std::string text = fmt::format("{}\n", scenario.title.empty() ? scenario.path : scenario.title);
  text += fmt::format("{} noise {}{}, {} s simulated in {} s on {} {}, seed {}, scored from {} s to {} s\n\n", c.runs(),
                      c.runs() == 1 ? "run" : "runs", c.in_loop ? " of each estimator" : "", plain(c.simulated_s),
                      significant(c.wall_s, 3), c.threads, c.threads == 1 ? "thread" : "threads", scenario.seed,
                      plain(scenario.score.from_s), plain(scenario.score.to_s));
  text += c.in_loop ? "Each estimator closing the loop: " : "Estimates against the truth: ";
  text += "mean ± half of its 95 % interval\n" + figures_text(c);
  if (c.estimators.size() > 1)
    text += "\nSpeed rms, paired by run: mean difference and its 95 % interval\n" + differences_text(c);
  for (const ComparedEstimator& e : c.estimators) {
    if (e.diverged_runs() == 0) continue;
    text += c.in_loop ? fmt::format("\nDIVERGED: {} in {} of {} runs, left out of the means\n", e.name,
                                    e.diverged_runs(), c.runs())
                      : fmt::format("\nDIVERGED: {} of {} runs, left out of the means\n", e.diverged_runs(), c.runs());
    if (!c.in_loop) break;
  }
  if (c.stopped) text += "\nINTERRUPTED; the finished runs are shown\n";
  if (!files.empty()) text += fmt::format("\n{}\n", fmt::join(files, "\n"));
  return text;
}

}  // namespace slipbench
