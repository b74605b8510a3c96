#include "tools/slipbench/comparison.hpp"

#include <algorithm>
#include <atomic>
#include <chrono>
#include <exception>
#include <mutex>
#include <thread>

#include "sim/scenario/scenario.hpp"
#include "sim/score/drive_score.hpp"
#include "sim/score/estimator_score.hpp"

namespace slipbench {

namespace {

std::size_t count_true(const std::vector<bool>& flags) {
  return static_cast<std::size_t>(std::count(flags.begin(), flags.end(), true));
}

struct SingleRun {
  RunOutcome outcome;
  std::vector<EstimatorFigures> estimators;
  DriveFigures drive;
};

SingleRun single_run(const Scenario& scenario, std::uint32_t run, const std::function<bool(double)>& keep_going) {
  const ScoreBasis basis = score_basis(scenario);
  EstimatorScore estimator_score(basis);
  DriveScore drive_score(basis);
  RunObserver* const observers[] = {&estimator_score, &drive_score};
  RunOptions options;
  options.noise_run = run;
  options.keep_going = keep_going;
  SingleRun result;
  result.outcome = simulate(scenario, observers, options);
  result.estimators = estimator_score.figures();
  result.drive = drive_score.figures();
  return result;
}

// A diverged run ended early: its figures would be those of another window, so it gives none.
void enter(Comparison& c, const ComparisonJob& job, const SingleRun& single, std::size_t run) {
  for (std::size_t i = 0; i < job.judged.size(); ++i) {
    ComparedEstimator& e = c.estimators[job.judged[i]];
    const EstimatorFigures& figures = single.estimators[i];
    e.diverged[run] = single.outcome.diverged;
    e.lost[run] = figures.lost_at_s.has_value() || (c.in_loop && single.outcome.diverged);
    if (single.outcome.diverged) continue;
    std::size_t f = 0;
    for (const auto& entry : estimator_figures) e.values[f++][run] = figures.*entry.value;
    if (!c.in_loop) continue;
    for (const auto& entry : drive_figures) e.values[f++][run] = single.drive.*entry.value;
  }
}

Comparison blank(const std::vector<ComparisonJob>& jobs, std::uint32_t runs, bool in_loop) {
  Comparison c;
  c.in_loop = in_loop;
  for (const auto& entry : estimator_figures)
    c.figure_names.push_back(entry.name), c.figure_units.push_back(entry.unit);
  if (in_loop) {
    for (const auto& entry : drive_figures) c.figure_names.push_back(entry.name), c.figure_units.push_back(entry.unit);
  }
  for (const ComparisonJob& job : jobs) {
    for (std::size_t i = 0; i < job.judged.size(); ++i) {
      if (c.estimators.size() <= job.judged[i]) c.estimators.resize(job.judged[i] + 1);
      ComparedEstimator& e = c.estimators[job.judged[i]];
      e.name = job.scenario.estimators[i].name;
      e.kind = job.scenario.estimators[i].kind;
      e.values.assign(c.figure_names.size(), std::vector<Figure>(runs));
      e.lost.assign(runs, false);
      e.diverged.assign(runs, false);
    }
  }
  return c;
}

}  // namespace

std::size_t ComparedEstimator::lost_runs() const { return count_true(lost); }
std::size_t ComparedEstimator::diverged_runs() const { return count_true(diverged); }
std::size_t Comparison::runs() const { return count_true(finished); }

std::size_t Comparison::figure(std::string_view name) const {
  const auto found = std::find(figure_names.begin(), figure_names.end(), name);
  return static_cast<std::size_t>(found - figure_names.begin());
}

Interval Comparison::interval(std::size_t estimator, std::size_t figure) const {
  return mean_interval(estimators[estimator].values[figure]);
}

Interval Comparison::difference(std::size_t a, std::size_t b, std::size_t figure) const {
  return paired_difference(estimators[a].values[figure], estimators[b].values[figure]);
}

Comparison compare_estimators(const std::vector<ComparisonJob>& jobs, std::uint32_t runs, bool in_loop,
                              unsigned threads, const std::function<bool(double)>& keep_going) {
  const auto begun = std::chrono::steady_clock::now();
  Comparison c = blank(jobs, runs, in_loop);
  const std::size_t tasks = jobs.size() * runs;  // task = run * jobs + job, so that a stop leaves whole runs
  c.threads = std::max(1u, std::min(threads == 0 ? std::thread::hardware_concurrency() : threads,
                                    static_cast<unsigned>(std::min<std::size_t>(tasks, 1024))));
  std::atomic<std::size_t> next{0};
  std::atomic<double> share_sum{0.0};
  std::atomic<bool> halt{false};
  std::mutex mutex;
  std::exception_ptr failure;
  std::size_t failed_task = tasks;
  std::vector<std::size_t> jobs_done(runs, 0);
  std::vector<std::vector<SingleRun>> parts(runs, std::vector<SingleRun>(jobs.size()));

  const auto work = [&] {
    for (std::size_t task = next++; task < tasks && !halt; task = next++) {
      const std::size_t run = task / jobs.size(), job = task % jobs.size();
      double told = 0.0;
      try {
        SingleRun single = single_run(jobs[job].scenario, static_cast<std::uint32_t>(run), [&](double share) {
          const double all = share_sum.fetch_add(share - told) + share - told;
          told = share;
          if (!keep_going(all / static_cast<double>(tasks))) halt = true;
          return !halt.load();
        });
        share_sum.fetch_add(1.0 - told);
        const std::lock_guard lock(mutex);
        c.simulated_s += single.outcome.simulated_s;
        if (single.outcome.stopped) continue;
        parts[run][job] = std::move(single);
        ++jobs_done[run];
      } catch (...) {
        const std::lock_guard lock(mutex);
        if (task < failed_task) failed_task = task, failure = std::current_exception();
        halt = true;
      }
    }
  };
  std::vector<std::thread> crew;
  for (unsigned i = 1; i < c.threads; ++i) crew.emplace_back(work);
  work();
  for (std::thread& member : crew) member.join();
  if (failure) std::rethrow_exception(failure);

  c.stopped = halt;
  for (std::size_t run = 0; run < runs; ++run) {
    c.finished.push_back(jobs_done[run] == jobs.size());
    if (!c.finished.back()) continue;
    for (std::size_t job = 0; job < jobs.size(); ++job) enter(c, jobs[job], parts[run][job], run);
  }
  c.wall_s = std::chrono::duration<double>(std::chrono::steady_clock::now() - begun).count();
  return c;
}

}  // namespace slipbench
