// sweep: every case of a plan into a store, or stores of shards joined.
#include <fmt/format.h>

#include <filesystem>
#include <memory>

#include "sim/record/csv_trace.hpp"
#include "sim/record/out_file.hpp"
#include "sim/sweep/merge.hpp"
#include "sim/sweep/sweep.hpp"
#include "tools/slipbench/interrupt.hpp"
#include "tools/slipbench/json_out.hpp"
#include "tools/slipbench/progress.hpp"
#include "tools/slipbench/sweep_figure.hpp"
#include "tools/slipbench/sweep_result.hpp"
#include "tools/slipbench/table.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

// NAME.sqlite beside nothing else: in the working folder, as other outputs are.
std::string store_path(const Request& request) {
  if (!request.store.empty()) return request.store;
  const std::string stem = std::filesystem::path(request.file).stem().string();
  if (request.shard.count == 1) return stem + ".sqlite";
  return fmt::format("{}.{}-of-{}.sqlite", stem, request.shard.index, request.shard.count);
}

// As RFC 4180 quotes it.
std::string csv_field(const std::string& text) {
  if (text.find_first_of(",\"\r\n") == std::string::npos) return text;
  std::string quoted = "\"";
  for (const char c : text) quoted += c == '"' ? std::string("\"\"") : std::string(1, c);
  return quoted + "\"";
}

void write_csv(OutFile& file, const Store& store) {
  std::string line = "case,run";
  for (const std::string& key : store.columns().keys) line += "," + key;
  for (const std::string& figure : store.columns().figures) line += "," + figure;
  file.write(line + "\n");
  store.each_row([&](const ResultRow& row) {
    line = fmt::format("{},{}", row.case_number, row.run);
    for (const std::string& value : row.values) {
      line += "," + csv_field(value);
    }
    for (const Figure& figure : row.figures) {
      line += ',';
      append_number(line, figure.value_or(std::nan("")));
    }
    file.write(line + "\n");
    return !file.failed();
  });
  file.finish();
}

// What a finished store says of each figure.
void add_distributions(SweepResult& result, const Store& store) {
  for (const std::string& figure : store.columns().figures) {
    Distribution d{figure, store.figure_count(figure), {}};
    if (d.count > 0) {
      const auto rank = [&](double share) {
        return static_cast<std::uint64_t>(share * static_cast<double>(d.count - 1) + 0.5);
      };
      d.values = store.at_ranks(figure, {0, rank(0.05), rank(0.5), rank(0.95), d.count - 1});
    }
    result.distributions.push_back(d);
    if (figure.ends_with(".speed_rmse_rpm")) result.worst.push_back({figure, store.largest(figure, 3)});
  }
}

}  // namespace

int sweep_verb(const Request& request) {
  want_plan(request);
  if (!request.search.empty()) return search_verb(request);
  const SweepPlan plan = read_plan(request.file, request.overrides, request.seed);
  // Before the joined store is made: a slip of the pen leaves none behind.
  for (const std::string& part : request.merge) {
    if (!std::filesystem::exists(part))
      throw InputError("command line", "--merge", fmt::format("--merge '{}': there is no such file", part), "file");
  }
  std::unique_ptr<OutFile> csv;
  if (!request.csv.empty()) csv = std::make_unique<OutFile>(request.csv);
  std::unique_ptr<OutFile> figure;
  const StoreColumns columns = columns_of(plan);
  const std::vector<std::string> chosen = chosen_figures(columns, request.figure_of);
  if (!request.figure_of.empty() && request.figure.empty() && !plan.sample)
    throw InputError(
        "command line", "--figure-of",
        "--figure-of says what --figure FILE.svg draws (and of a plan with [sample], what sensitivities are "
        "told of): name a file, or leave it out",
        "usage");
  if (!request.figure.empty()) figure = std::make_unique<OutFile>(request.figure);
  Store store(store_path(request), origin_of(plan), columns);

  SweepResult result;
  result.plan = &plan;
  result.store = store.path();
  if (!request.merge.empty()) {
    result.merged = merge_stores(plan, store, request.merge);
  } else if (request.on_slurm) {
    result.cluster = sweep_on_slurm(request, plan, store);
    result.outcome.stopped = result.cluster->stopped;
    result.outcome.wall_s = result.cluster->wall_s;
    if (!result.cluster->stopped) result.merged = result.cluster->merged;
  } else {
    Progress progress("sweep", request.progress, request.quiet);
    SweepOptions options;
    options.threads = request.threads;
    options.isa = request.isa;
    options.shard = request.shard;
    options.keep_going = [&](const SweepProgress& p) {
      progress.update(p.rows > 0 ? static_cast<double>(p.done) / static_cast<double>(p.rows) : 1.0);
      return !interrupted();
    };
    result.outcome = run_sweep(plan, store, options);
  }
  result.diverged = store.status_count("diverged");
  result.refused = store.status_count("refused");
  result.lost = store.status_count("lost");
  result.rows = store.rows();
  if (!request.json && !request.quiet) add_distributions(result, store);
  const bool part = request.shard.count > 1 || result.outcome.stopped;
  if (plan.sample && !part && (figure || request.json || !request.quiet))
    result.sensitivities = sensitivities_of(plan, store, judged_figures(store.columns(), chosen));
  if (figure) {
    figure->write(sweep_figure(picture_of(plan, store, chosen, result.sensitivities)));
    figure->finish();
    result.files.push_back(fmt::format("figure: {}", request.figure));
  }
  if (csv) {
    write_csv(*csv, store);
    result.files.push_back(fmt::format("csv:   {}", request.csv));
  }
  if (request.json) {
    print(json_document(result));
  } else if (!request.quiet) {
    print(sweep_summary(result));
  }
  if (result.outcome.stopped) return ExitStatus::stopped;
  const bool gaps = result.merged && result.merged->missing > 0;
  return result.diverged + result.refused > 0 || gaps ? ExitStatus::bad_result : ExitStatus::done;
}

}  // namespace slipbench
