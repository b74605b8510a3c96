// The summary of a sweep as text.
#include <fmt/format.h>

#include "tools/slipbench/sweep_result.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

std::string work_text(const SweepResult& r) {
  const SweepOutcome& o = r.outcome;
  std::string shards;
  if (r.cluster) {
    const ClusterOutcome& c = *r.cluster;
    if (c.stopped)
      return "INTERRUPTED: the array is cancelled; stores of shards are kept in " + r.store +
             ".shards; the same command goes on\n";
    shards = fmt::format("{} shards on Slurm in {} s", c.shards, significant(c.wall_s, 3));
    if (c.lost > 0) shards += fmt::format(", {} of their tasks submitted again after they were lost", c.lost);
    shards += "\n";
  }
  if (r.merged) {
    std::string text = shards + fmt::format("{} rows joined", r.merged->rows);
    if (r.merged->twice > 0) text += fmt::format(", {} of them found more than once", r.merged->twice);
    return text + (r.merged->missing > 0 ? fmt::format("; {} are still MISSING: run their shards\n", r.merged->missing)
                                         : "\n");
  }
  std::string text = fmt::format("{} rows in {} s", o.done, significant(o.wall_s, 3));
  if (o.done > 0 && o.wall_s > 0.0)
    text += fmt::format(" ({} a second, {} times real time)", significant(static_cast<double>(o.done) / o.wall_s, 3),
                        significant(o.simulated_s / o.wall_s, 3));
  if (o.resumed > 0) text += fmt::format(", {} were there before", o.resumed);
  text += fmt::format("; {} thread{}, ", o.threads, o.threads == 1 ? "" : "s");
  text += o.lanes > 1 ? fmt::format("packs of {} ({})\n", o.lanes, o.isa) : "one case at a time\n";
  for (const auto& [reason, rows] : o.not_in_lanes) {
    if (o.lanes > 1) text += fmt::format("{} rows ran alone: {}\n", rows, reason);
  }
  if (o.stopped) text += "INTERRUPTED: what was finished is kept; the same command goes on\n";
  return text;
}

std::string distribution_text(const SweepResult& r) {
  Table table;
  table.column("figure", "", Table::Align::left);
  for (const char* heading : {"least", "5 %", "median", "95 %", "largest"}) table.column(heading, "");
  table.column("none", "");
  for (const Distribution& d : r.distributions) {
    if (d.count == 0) continue;
    std::vector<std::string> cells = {d.figure};
    for (const double value : d.values) cells.push_back(significant(value));
    cells.push_back(d.count < r.rows ? std::to_string(r.rows - d.count) : "-");
    table.row(cells);
  }
  return table.text();
}

std::string worst_text(const SweepResult& r) {
  Table table;
  table.column("worst of", "", Table::Align::left);
  table.column("value", "");
  table.column("case", "");
  table.column("run", "");
  table.column("with", "", Table::Align::left);
  for (const WorstRows& worst : r.worst) {
    for (const ResultRow& row : worst.rows) {
      std::string with;
      const std::vector<std::string> keys = r.plan->keys();
      for (std::size_t i = 0; i < keys.size() && i < row.values.size(); ++i) {
        const Figure number = row.values[i].empty() ? Figure() : Figure(std::strtod(row.values[i].c_str(), nullptr));
        const bool is_number = row.values[i].find_first_not_of("0123456789.+-e") == std::string::npos;
        with += (with.empty() ? "" : ", ") + keys[i] + " " + (is_number ? plain(number, 5) : row.values[i]);
      }
      std::size_t at = 0;
      for (const Distribution& d : r.distributions) {
        if (d.figure == worst.figure) break;
        ++at;
      }
      table.row({worst.figure, significant(row.figures.at(at)), std::to_string(row.case_number),
                 std::to_string(row.run), with});
    }
  }
  return table.text();
}

}  // namespace

std::string sweep_summary(const SweepResult& r) {
  const SweepPlan& plan = *r.plan;
  std::string text = fmt::format("{}\n{} cases x {} noise run{} of {}\n", plan.title.empty() ? plan.path : plan.title,
                                 plan.cases(), plan.runs, plan.runs == 1 ? "" : "s", plan.scenario);
  text += work_text(r);
  if (r.diverged > 0) text += fmt::format("DIVERGED: {} rows\n", r.diverged);
  if (r.refused > 0) text += fmt::format("REFUSED: {} rows, whose keys do not go together\n", r.refused);
  if (r.lost > 0) text += fmt::format("an estimator was lost in {} rows\n", r.lost);
  if (r.rows > 0 && !r.distributions.empty()) text += "\nOver all rows\n" + distribution_text(r);
  if (!r.worst.empty())
    text += "\n" + worst_text(r) + "\nRepeat one alone: slipbench run " + plan.path + " --case K --run R\n";
  text += sensitivity_text(r);
  text += fmt::format("\nstore: {} ({} rows)\n", r.store, r.rows);
  for (const std::string& file : r.files) text += file + "\n";
  return text;
}

}  // namespace slipbench
