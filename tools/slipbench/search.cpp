// sweep --search: the keys at which a figure is worst.
#include <fmt/format.h>

#include <filesystem>
#include <memory>

#include "sim/record/out_file.hpp"
#include "sim/scenario/tree.hpp"
#include "sim/sweep/worst_case.hpp"
#include "tools/slipbench/interrupt.hpp"
#include "tools/slipbench/json_out.hpp"
#include "tools/slipbench/progress.hpp"
#include "tools/slipbench/table.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

// The one output that could stand in the place of what it was made from.
void keep_inputs(const SweepPlan& plan, const std::string& path) {
  std::error_code none;
  for (const std::string& input : {plan.path, plan.scenario}) {
    if (std::filesystem::equivalent(path, input, none)) {
      throw InputError("command line", "--write", "--write '" + path + "' is what the case is made from; name another",
                       "usage");
    }
  }
}

std::string where_text(const WorstCase& w) {
  Table table;
  table.column("key", "", Table::Align::left);
  for (const char* heading : {"worst at", "from", "to"}) table.column(heading, "");
  for (std::size_t j = 0; j < w.at.size(); ++j) {
    for (const std::string& key : w.box[j].keys)
      table.row({key, plain(w.at[j]), plain(w.box[j].low), plain(w.box[j].high)});
  }
  return table.text();
}

std::string fresh_text(const WorstCase& w) {
  if (w.fresh.empty()) return "";
  std::string text = fmt::format("On {} other noise runs: ", w.fresh.size());
  const Interval& i = w.fresh_mean;
  if (i.mean && i.low)
    text += fmt::format("{} (mean, 95 %)", plus_minus(*i.mean, *i.high - *i.mean));
  else
    text += i.mean ? significant(i.mean) : "no such figure";
  if (w.fresh_diverged > 0) text += fmt::format("; {} DIVERGED", w.fresh_diverged);
  return text + "\n";
}

std::string summary(const SweepPlan& plan, const WorstCase& w, const Request& request) {
  std::string text = fmt::format("{}\nworst {} within the plan's ranges, {} runs of {}\n",
                                 plan.title.empty() ? plan.path : plan.title, request.search, w.runs, plan.scenario);
  if (w.stopped) text += "INTERRUPTED: the worst so far\n";
  if (w.at.empty()) return text + "no run had this figure\n";
  if (w.value)
    text += fmt::format("{} = {} (least met: {})\n", request.search, significant(w.value), significant(w.least));
  else
    text += fmt::format("DIVERGED: {}; nothing is worse, so the search ended there\n", w.message);
  if (w.status == "lost") text += fmt::format("estimator {} was lost there\n", w.message);
  if (w.flat) text += "the figure is the same everywhere: it does not hang on these keys\n";
  if (w.without > 0) text += fmt::format("{} runs had no such figure, or were refused\n", w.without);
  text += fresh_text(w) + "\n" + where_text(w);
  if (!request.write.empty())
    return text + fmt::format("\nwritten: {0}; repeat it: slipbench run {0}\n", request.write);
  text += fmt::format("\nRepeat it: slipbench run {}", plan.scenario);
  for (const Override& o : overrides_of(plan, w)) text += fmt::format(" --set {}={}", o.key, o.value);
  return text + (plan.seed ? fmt::format(" --seed {}\n", *plan.seed) : "\n");
}

}  // namespace

int search_verb(const Request& request) {
  const SweepPlan plan = read_plan(request.file, request.overrides, request.seed);
  std::unique_ptr<OutFile> file;
  if (!request.write.empty()) {
    keep_inputs(plan, request.write);
    file = std::make_unique<OutFile>(request.write);
  }
  WorstCase worst;
  {
    Progress progress("search", request.progress, request.quiet);
    WorstCaseOptions options;
    options.figure = request.search;
    options.budget = request.budget;
    options.threads = request.threads;
    options.isa = request.isa;
    options.keep_going = [&](std::size_t runs) {
      progress.update(static_cast<double>(runs) / (request.budget + options.fresh_runs));
      return !interrupted();
    };
    worst = find_worst_case(plan, options);
  }
  const bool found = !worst.at.empty();
  if (file && found) {
    const std::string folder = std::filesystem::path(request.write).parent_path().string();
    file->write(scenario_text(plan, worst, request.search, folder));
    file->finish();
  }
  if (request.json)
    print(json_document(worst, request.search, found ? request.write : ""));
  else if (!request.quiet)
    print(summary(plan, worst, request));
  if (worst.stopped) return ExitStatus::stopped;
  return found && worst.status != "diverged" ? ExitStatus::done : ExitStatus::bad_result;
}

}  // namespace slipbench
