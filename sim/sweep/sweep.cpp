#include "sim/sweep/sweep.hpp"

#include <algorithm>
#include <atomic>
#include <chrono>
#include <condition_variable>
#include <deque>
#include <exception>
#include <filesystem>
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
  void put(std::vector<ResultRow> rows) {
    std::unique_lock lock(mutex_);
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
  [[nodiscard]] std::exception_ptr error() {
    const std::lock_guard lock(mutex_);
    return error_;
  }

 private:
  std::mutex mutex_;
  std::condition_variable room_, ended_;
  std::deque<ResultRow> rows_;
  std::exception_ptr error_;
  unsigned workers_ = 0;
  bool closed_ = false;
};

// Finds the next unit that is not in the store yet. The store is asked from the main thread only, so missing units are listed by it,
// a stretch at a time.
class Queue {
 public:
  void put(const std::vector<Unit>& units) {
    const std::lock_guard lock(mutex_);
    units_.insert(units_.end(), units.begin(), units.end());
    changed_.notify_all();
  }
  void finish() {
    const std::lock_guard lock(mutex_);
    finished_ = true;
    changed_.notify_all();
  }
  // False when there is no more.
  bool next(Unit& unit) {
    std::unique_lock lock(mutex_);
    changed_.wait(lock, [&] { return finished_ || !units_.empty(); });
    if (units_.empty()) return false;
    unit = units_.front();
    units_.pop_front();
    return true;
  }
  void clear() {
    const std::lock_guard lock(mutex_);
    units_.clear();
    finished_ = true;
    changed_.notify_all();
  }
  [[nodiscard]] std::size_t size() {
    const std::lock_guard lock(mutex_);
    return units_.size();
  }

 private:
  std::mutex mutex_;
  std::condition_variable changed_;
  std::deque<Unit> units_;
  bool finished_ = false;
};

// Runs one unit: its cases are read, grouped into packs by the runner, and come back as rows.
std::vector<ResultRow> run_unit(const SweepPlan& plan, const ScenarioFile& file, CaseMaker& maker, PackRunner& runner,
                                const Unit& unit, std::size_t keys, std::size_t figures) {
  std::vector<ResultRow> rows(unit.last - unit.first);
  std::vector<PackCase> cases;
  cases.reserve(rows.size());
  for (std::uint64_t k = unit.first; k < unit.last; ++k) {
    ResultRow& row = rows[k - unit.first];
    row.case_number = k;
    row.run = unit.run;
    const std::vector<Override> overrides = maker.overrides(k);
    for (std::size_t i = overrides.size() - keys; i < overrides.size(); ++i) row.values.push_back(overrides[i].value);
    try {
      cases.push_back({file.read(overrides, plan.seed), &row});
    } catch (const InputError& error) {
      fill_refused(row, error.message(), figures);
    }
  }
  runner.run(cases, unit.run);
  for (ResultRow& row : rows) row.figures.resize(figures);
  return rows;
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

  Queue queue;
  Finished finished;
  std::atomic<bool> stop{false};
  std::vector<PackRunner> runners;
  runners.reserve(outcome.threads);
  for (unsigned t = 0; t < outcome.threads; ++t) runners.emplace_back(options.isa, [&] { return !stop.load(); });
  outcome.isa = runners.front().isa();
  outcome.lanes = runners.front().lanes();
  finished.enter(outcome.threads);
  std::vector<std::thread> workers;
  const auto start = [&] {
    for (unsigned t = 0; t < outcome.threads; ++t) {
      workers.emplace_back([&, t] {
        std::exception_ptr error;
        try {
          CaseMaker maker(plan);
          for (Unit unit; !stop.load() && queue.next(unit);) {
            std::vector<ResultRow> rows = run_unit(plan, file, maker, runners[t], unit, keys, figures);
            if (!stop.load()) finished.put(std::move(rows));  // a unit that was stopped half-way is not kept
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
    queue.clear();
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
      while (asked < units.count() && queue.size() < units_ahead * outcome.threads) {
        const Unit unit = units.at(asked++);
        const std::uint64_t there = store.rows_between(unit.run, unit.first, unit.last);
        if (there == unit.last - unit.first)
          outcome.resumed += there;
        else
          queue.put({unit});
      }
      if (asked == units.count()) queue.finish();
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
  for (const PackRunner& runner : runners) {
    outcome.in_lanes += runner.in_lanes();
    outcome.simulated_s += runner.simulated_s();
    for (const auto& [reason, rows] : runner.not_in_lanes()) outcome.not_in_lanes[reason] += rows;
  }
  outcome.wall_s = std::chrono::duration<double>(Clock::now() - begun).count();
  return outcome;
}

}  // namespace slipbench
