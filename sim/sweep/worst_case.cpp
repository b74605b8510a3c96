#include "sim/sweep/worst_case.hpp"

#include <algorithm>
#include <atomic>
#include <cmath>
#include <exception>
#include <limits>
#include <map>
#include <thread>

#include "sim/scenario/keys.hpp"
#include "sim/scenario/nearest.hpp"
#include "sim/scenario/tree.hpp"
#include "sim/sweep/case_run.hpp"
#include "sim/sweep/pack_runner.hpp"
#include "sim/sweep/search.hpp"
#include "sim/sweep/sweep.hpp"

namespace slipbench {

namespace {

constexpr double sigmas = 3.0;  // of a normal spread: all but 0.3 % of it (common practice)

// Runs points of the box, in packs and threads.
class Points {
 public:
  Points(const SweepPlan& plan, const std::vector<Coordinate>& box, const WorstCaseOptions& options,
         std::size_t figures)
      : plan_(plan), box_(box), options_(options), file_(plan.scenario), figures_(figures) {
    const unsigned threads = options.threads > 0 ? options.threads : std::max(1u, std::thread::hardware_concurrency());
    runners_.reserve(threads);
    for (unsigned t = 0; t < threads; ++t) runners_.emplace_back(options.isa, [this] { return going(); });
  }

  [[nodiscard]] bool going() const { return !options_.keep_going || options_.keep_going(done_.load()); }

  // One row a point; fewer where it was stopped.
  std::vector<ResultRow> run(const std::vector<Point>& points, std::uint32_t first_noise,
                             std::uint32_t noise_runs = 1) {
    std::vector<ResultRow> rows(points.size() * noise_runs);
    const std::size_t pack = runners_.front().lanes(), packs = (points.size() + pack - 1) / pack;
    const std::size_t all = packs * noise_runs;
    std::atomic<std::size_t> next{0};
    std::exception_ptr error;
    std::atomic<bool> failed{false};
    const auto work = [&](PackRunner& runner) {
      try {
        for (std::size_t p; (p = next++) < all && going();) {
          const std::size_t noise = p / packs, first = p % packs * pack, last = std::min(points.size(), first + pack);
          run_pack(runner, points, first, last, rows.data() + noise * points.size(),
                   first_noise + static_cast<std::uint32_t>(noise));
        }
      } catch (...) {
        if (!failed.exchange(true)) error = std::current_exception();
      }
    };
    std::vector<std::thread> others;
    for (std::size_t t = 1; t < std::min(runners_.size(), all); ++t) others.emplace_back([&, t] { work(runners_[t]); });
    work(runners_.front());
    for (std::thread& other : others) other.join();
    if (error) std::rethrow_exception(error);
    if (!going()) return {};  // some were cut short
    done_ += rows.size();
    return rows;
  }

  [[nodiscard]] std::vector<Override> overrides(const Point& point) const {
    std::vector<Override> all = plan_.overrides;
    for (std::size_t j = 0; j < box_.size(); ++j) {
      for (const std::string& key : box_[j].keys) all.push_back({key, number_text(box_[j].at(point[j]))});
    }
    return all;
  }

 private:
  void run_pack(PackRunner& runner, const std::vector<Point>& points, std::size_t first, std::size_t last,
                ResultRow* rows, std::uint32_t noise) {
    std::vector<PackCase> cases;
    for (std::size_t i = first; i < last; ++i) {
      try {
        cases.push_back({file_.read(overrides(points[i]), plan_.seed), &rows[i]});
      } catch (const InputError& refusal) {
        fill_refused(rows[i], refusal.message(), figures_);
      }
    }
    runner.run(std::move(cases), noise);
    for (std::size_t i = first; i < last; ++i) rows[i].figures.resize(figures_);
  }

  const SweepPlan& plan_;
  const std::vector<Coordinate>& box_;
  const WorstCaseOptions& options_;
  const ScenarioFile file_;
  const std::size_t figures_;
  std::vector<PackRunner> runners_;
  std::atomic<std::size_t> done_{0};
};

std::size_t column_of(const std::vector<std::string>& columns, const std::string& figure) {
  const auto found = std::find(columns.begin(), columns.end(), figure);
  if (found != columns.end()) return static_cast<std::size_t>(found - columns.begin());
  const std::vector<std::string_view> names(columns.begin(), columns.end());
  throw InputError("command line", "--search",
                   "--search '" + printable(figure) + "': no such figure of this plan's scenario; the nearest is " +
                       std::string(nearest(figure, names)),
                   "usage");
}

double number_of(const Vary& vary, const std::string& text) {
  char* end = nullptr;
  const double number = std::strtod(text.c_str(), &end);
  if (text.empty() || *end != '\0' || !std::isfinite(number)) {
    throw InputError(vary.key_places.front(), vary.keys.front(),
                     "'" + vary.keys.front() + "' takes '" + printable(text) +
                         "' here, which is no number: a search goes over numbers alone; take it out of the plan",
                     "type");
  }
  return number;
}

// What is refused at the ends is told at the plan's own line.
void check_box(const SweepPlan& plan, const std::vector<Coordinate>& box) {
  const ScenarioFile file(plan.scenario);
  for (const Coordinate& c : box) {
    Scenario scenario;
    for (const double end : {c.low, c.high}) {
      std::vector<Override> overrides = plan.overrides;
      for (const std::string& key : c.keys) overrides.push_back({key, number_text(end)});
      try {
        scenario = file.read(overrides, plan.seed);
      } catch (const InputError& e) {
        if (!e.place().starts_with("--set:")) throw;
        throw InputError(c.place, e.key(), "at an end of what is searched: " + e.message(), e.code());
      }
    }
    for (const std::string& key : c.keys) {
      const Key* row = find_key(scenario, key);
      if (row != nullptr && row->numeric()) continue;
      throw InputError(
          c.place, key,
          "'" + key + "' holds no real number, and a search goes over those alone; take it out of the plan", "type");
    }
  }
}

}  // namespace

double Coordinate::at(double u) const { return u >= 1.0 ? high : low + u * (high - low); }

std::vector<Coordinate> box_of(const SweepPlan& plan) {
  std::vector<Coordinate> box;
  for (const Vary& vary : plan.varies) {
    Coordinate c{vary.keys, number_of(vary, vary.values.front()), 0.0, vary.key_places.front()};
    c.high = c.low;
    for (const std::string& value : vary.values) {
      const double x = number_of(vary, value);
      c.low = std::min(c.low, x), c.high = std::max(c.high, x);
    }
    box.push_back(c);
  }
  if (plan.sample) {
    for (const DrawnKey& key : plan.sample->keys) {
      const bool uniform = key.distribution == DrawnKey::Distribution::uniform;
      box.push_back({key.keys, uniform ? key.low : key.mean - sigmas * key.sigma,
                     uniform ? key.high : key.mean + sigmas * key.sigma, key.key_places.front()});
    }
  }
  if (std::none_of(box.begin(), box.end(), [](const Coordinate& c) { return c.low < c.high; }))
    throw InputError(plan.path, "", "no key of this plan takes more than one value: there is nothing to search",
                     "range");
  check_box(plan, box);
  return box;
}

WorstCase find_worst_case(const SweepPlan& plan, const WorstCaseOptions& options) {
  WorstCase worst;
  worst.box = box_of(plan);
  const StoreColumns columns = columns_of(plan);
  const std::size_t column = column_of(columns.figures, options.figure);
  worst.seed = ScenarioFile(plan.scenario).read(plan.overrides, plan.seed).seed;

  Points points(plan, worst.box, options, columns.figures.size());
  std::map<Point, ResultRow> rows;
  worst.least = std::numeric_limits<double>::infinity();
  const Judge judge = [&](const std::vector<Point>& wanted) {
    std::vector<double> values;
    const std::vector<ResultRow> found = points.run(wanted, 0);
    for (std::size_t i = 0; i < found.size(); ++i) {
      const Figure& figure = found[i].figures[column];
      const bool diverged = found[i].status == "diverged";
      if (figure) worst.least = std::min(worst.least, *figure);
      worst.without += !figure && !diverged;
      values.push_back(diverged ? std::numeric_limits<double>::infinity()
                                : figure.value_or(std::numeric_limits<double>::quiet_NaN()));
      rows.emplace(wanted[i], found[i]);
    }
    return values;
  };
  const SearchOutcome found = largest_in_cube(worst.box.size(), options.budget, worst.seed, judge);
  worst.runs = found.evaluations;
  worst.stopped = found.stopped;
  worst.flat = found.flat;
  if (found.best.empty()) return worst;
  for (std::size_t j = 0; j < worst.box.size(); ++j) worst.at.push_back(worst.box[j].at(found.best[j]));
  const ResultRow& row = rows.at(found.best);
  worst.status = row.status, worst.message = row.message;
  worst.value = row.figures[column];
  if (worst.stopped) return worst;
  const std::vector<ResultRow> fresh = points.run({found.best}, 1, options.fresh_runs);
  worst.stopped = fresh.empty();
  for (const ResultRow& other : fresh) {
    worst.fresh.push_back(other.figures[column]);
    worst.fresh_diverged += other.status == "diverged";
  }
  worst.fresh_mean = mean_interval(worst.fresh);
  return worst;
}

std::vector<Override> overrides_of(const SweepPlan& plan, const WorstCase& worst) {
  std::vector<Override> all = plan.overrides;
  for (std::size_t j = 0; j < worst.at.size(); ++j) {
    for (const std::string& key : worst.box[j].keys) all.push_back({key, number_text(worst.at[j])});
  }
  return all;
}

}  // namespace slipbench
