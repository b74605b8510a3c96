#include "sim/sweep/sweep.hpp"

#include <algorithm>
#include <atomic>
#include <chrono>
#include <condition_variable>
#include <deque>
#include <exception>
#include <filesystem>
#include <memory>
#include <mutex>
#include <thread>

#include "sim/scenario/tree.hpp"
#include "sim/sweep/case_run.hpp"
#include "sim/sweep/pack_runner.hpp"

namespace slipbench {

namespace {

using Clock = std::chrono::steady_clock;

constexpr auto time_between_batches = std::chrono::milliseconds(200);
constexpr std::size_t units_ahead = 64;                         // for each thread
constexpr std::size_t most_waiting_rows = 64 * cases_per_unit;  // then workers wait for the store

struct Unit {
  std::uint32_t run = 0;
  std::uint64_t first = 0, last = 0;  // cases
};

// The units of one shard, by number.
class Units {
 public:
  Units(const SweepPlan& plan, Shard shard)
      : cases_(plan.cases()),
        per_run_((cases_ + cases_per_unit - 1) / cases_per_unit),
        all_(per_run_ * plan.runs),
        shard_(shard) {}
  [[nodiscard]] std::uint64_t count() const {
    return all_ > shard_.index ? (all_ - shard_.index - 1) / shard_.count + 1 : 0;
  }
  // Cases times runs of this shard: whole units, less what the last unit of each run lacks.
  [[nodiscard]] std::uint64_t rows() const {
    std::uint64_t rows = count() * cases_per_unit;
    const std::uint64_t lacking = per_run_ * cases_per_unit - cases_;
    for (std::uint64_t last = per_run_ - 1; last < all_; last += per_run_) {
      if (last % shard_.count == shard_.index) rows -= lacking;
    }
    return rows;
  }
  [[nodiscard]] Unit at(std::uint64_t number) const {
    const std::uint64_t u = number * shard_.count + shard_.index, block = u % per_run_;
    return {static_cast<std::uint32_t>(u / per_run_), block * cases_per_unit,
            std::min(cases_, (block + 1) * cases_per_unit)};
  }

 private:
  std::uint64_t cases_, per_run_, all_;
  Shard shard_;
};

// Finished rows on their way from the workers to the store.
class Finished {
 public:
  void put(std::vector<ResultRow> rows, const RanHow& how) {
    std::unique_lock lock(mutex_);
    how_.add(how);
    room_.wait(lock, [&] { return rows_.size() < most_waiting_rows || closed_; });
    for (ResultRow& row : rows) rows_.push_back(std::move(row));
  }
  std::vector<ResultRow> take(std::chrono::milliseconds patience) {
    std::unique_lock lock(mutex_);
    ended_.wait_for(lock, patience, [&] { return workers_ == 0; });
    std::vector<ResultRow> rows(std::make_move_iterator(rows_.begin()), std::make_move_iterator(rows_.end()));
    rows_.clear();
    room_.notify_all();
    return rows;
  }
  void close() {
    const std::lock_guard lock(mutex_);
    closed_ = true;
    room_.notify_all();
  }
  void enter(unsigned workers) { workers_ = workers; }
  void leave(std::exception_ptr error) {
    const std::lock_guard lock(mutex_);
    if (error && !error_) error_ = error;
    --workers_;
    ended_.notify_all();
  }
  [[nodiscard]] bool over() {
    const std::lock_guard lock(mutex_);
    return workers_ == 0 && rows_.empty();
  }
  [[nodiscard]] RanHow how() {
    const std::lock_guard lock(mutex_);
    return how_;
  }
  [[nodiscard]] std::exception_ptr error() {
    const std::lock_guard lock(mutex_);
    return error_;
  }

 private:
  std::mutex mutex_;
  std::condition_variable room_, ended_;
  std::deque<ResultRow> rows_;
  RanHow how_;
  std::exception_ptr error_;
  unsigned workers_ = 0;
  bool closed_ = false;
};

// What all workers share of one sweep.
struct Workshop {
  const SweepPlan& plan;
  const ScenarioFile& file;
  const PackRunner& runner;
  Work& work;
  Finished& finished;
  std::size_t keys, figures;
  std::deque<CaseMaker> makers;  // one a worker
};

// Reads the cases of one unit and adds them to the work; the last of them sends the unit's rows to the store.
void begin_unit(Workshop& shop, const Unit& unit, CaseMaker& maker) {
  const auto rows = std::make_shared<std::vector<ResultRow>>(unit.last - unit.first);
  std::vector<PackCase> cases;
  cases.reserve(rows->size());
  for (std::uint64_t k = unit.first; k < unit.last; ++k) {
    ResultRow& row = (*rows)[k - unit.first];
    row.case_number = k;
    row.run = unit.run;
    const std::vector<Override> overrides = maker.overrides(k);
    for (std::size_t i = overrides.size() - shop.keys; i < overrides.size(); ++i)
      row.values.push_back(overrides[i].value);
    try {
      cases.push_back({shop.file.read(overrides, shop.plan.seed), &row});
    } catch (const InputError& error) {
      fill_refused(row, error.message(), shop.figures);
    }
  }
  shop.runner.start(std::move(cases), unit.run, shop.work, [&shop, rows](const RanHow& how) {
    for (ResultRow& row : *rows) row.figures.resize(shop.figures);
    shop.finished.put(std::move(*rows), how);
  });
}

void count(SweepOutcome& outcome, const std::vector<ResultRow>& rows) {
  for (const ResultRow& row : rows) {
    outcome.done += 1;
    outcome.diverged += row.status == "diverged";
    outcome.refused += row.status == "refused";
    outcome.lost += row.status == "lost";
  }
}

}  // namespace

Origin origin_of(const SweepPlan& plan) {
  const auto text_of = [](const std::string& path) {
    std::string why;
    return read_text(path, why).value_or("");
  };
  std::string overrides;
  for (const Override& o : plan.of_plan) overrides += "plan." + o.key + "=" + o.value + "\n";
  for (const Override& o : plan.overrides) overrides += o.key + "=" + o.value + "\n";
  Origin origin = {{"format", "1"},
                   {"plan", plan.text},
                   {"scenario", text_of(plan.scenario)},
                   {"overrides", overrides},
                   {"seed", plan.seed ? std::to_string(*plan.seed) : "of the scenario"},
                   {"cases", std::to_string(plan.cases())},
                   {"runs", std::to_string(plan.runs)},
                   {"slipbench", SLIPBENCH_VERSION}};
  std::string machines;
  // Named from the scenario's folder, as the working folder may be another when the sweep goes on.
  const auto folder = std::filesystem::path(plan.scenario).parent_path();
  for (const std::string& path : scenario_of(plan).machine_files())
    machines += std::filesystem::path(path).lexically_relative(folder).string() + "\n" + text_of(path);
  origin.emplace_back("machines", machines);
  return origin;
}

StoreColumns columns_of(const SweepPlan& plan) {
  return {plan.keys(), figure_columns(scenario_of(plan).read(CaseMaker(plan).overrides(0), plan.seed))};
}

std::uint64_t missing_rows(const SweepPlan& plan, const Store& store, Shard shard) {
  const Units units(plan, shard);
  std::uint64_t missing = 0;
  for (std::uint64_t u = 0; u < units.count(); ++u) {
    const Unit unit = units.at(u);
    if (store.rows_between(unit.run, unit.first, unit.last) < unit.last - unit.first) missing += unit.last - unit.first;
  }
  return missing;
}

SweepOutcome run_sweep(const SweepPlan& plan, Store& store, const SweepOptions& options) {
  const auto begun = Clock::now();
  const ScenarioFile file = scenario_of(plan);
  const Units units(plan, options.shard);
  const std::size_t keys = plan.keys().size(), figures = store.columns().figures.size();
  SweepOutcome outcome;
  outcome.threads = options.threads > 0 ? options.threads : std::max(1u, std::thread::hardware_concurrency());

  Work work;
  Finished finished;
  std::atomic<bool> stop{false};
  const PackRunner runner(options.isa, [&] { return !stop.load(); });
  outcome.isa = runner.isa();
  outcome.lanes = runner.lanes();
  Workshop shop{plan, file, runner, work, finished, keys, figures, {}};
  for (unsigned t = 0; t < outcome.threads; ++t) shop.makers.emplace_back(plan);
  finished.enter(outcome.threads);
  std::vector<std::thread> workers;
  const auto start = [&] {
    for (unsigned t = 0; t < outcome.threads; ++t) {
      workers.emplace_back([&, t] {
        std::exception_ptr error;
        try {
          while (!stop.load() && work.run_one(t)) {
          }
        } catch (...) {
          error = std::current_exception();
        }
        finished.leave(error);
      });
    }
  };
  const auto halt = [&] {
    stop = true;
    work.close();
    finished.close();
    for (std::thread& worker : workers) worker.join();
    workers.clear();
  };

  try {
    start();
    outcome.rows = units.rows();
    std::uint64_t asked = 0;
    bool wanted = true;
    while (wanted) {
      while (asked < units.count() && work.waiting_new() < units_ahead * outcome.threads) {
        const Unit unit = units.at(asked++);
        const std::uint64_t there = store.rows_between(unit.run, unit.first, unit.last);
        if (there == unit.last - unit.first)
          outcome.resumed += there;
        else
          work.add_new([&shop, unit](std::size_t worker) {
            begin_unit(shop, unit, shop.makers[worker]);
            return false;
          });
      }
      if (asked == units.count()) work.finish();
      const std::vector<ResultRow> rows = finished.take(time_between_batches);
      store.write(rows);
      count(outcome, rows);
      if (finished.error()) std::rethrow_exception(finished.error());
      const double seconds = std::chrono::duration<double>(Clock::now() - begun).count();
      if (options.keep_going &&
          !options.keep_going({outcome.rows, outcome.done + outcome.resumed, outcome.resumed, seconds})) {
        outcome.stopped = true;
        break;
      }
      wanted = !(asked == units.count() && finished.over());
    }
  } catch (...) {
    halt();
    throw;
  }
  halt();
  // Units that came in while the rest was told to stop.
  const std::vector<ResultRow> late = finished.take(std::chrono::milliseconds(0));
  store.write(late);
  count(outcome, late);
  const RanHow how = finished.how();
  outcome.in_lanes = how.in_lanes;
  outcome.simulated_s = how.simulated_s;
  outcome.not_in_lanes = how.not_in_lanes;
  outcome.wall_s = std::chrono::duration<double>(Clock::now() - begun).count();
  return outcome;
}

}  // namespace slipbench
