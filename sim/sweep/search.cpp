#include "sim/sweep/search.hpp"

#include <algorithm>
#include <cmath>
#include <exception>
#include <limits>
#include <map>
#include <nlopt.hpp>

#include "plant/math/elementary.hpp"
#include "sim/sweep/draws.hpp"

namespace slipbench {

namespace {

constexpr double apart = 0.15;        // of the cube's side: nearer starts would climb the same hill
constexpr double finest_step = 1e-4;  // of the cube's side: no mismatch is known better
constexpr double least_gain = 1e-6;   // relative
constexpr std::size_t most_corners = 64;
constexpr std::size_t points_at_once = 64;  // what a stop may cost

double distance(const Point& a, const Point& b) {
  double most = 0.0;
  for (std::size_t j = 0; j < a.size(); ++j) most = std::max(most, std::abs(a[j] - b[j]));
  return most;
}

class Search {
 public:
  Search(std::size_t dimensions, std::size_t budget, std::uint64_t seed, const Judge& judge)
      : d_(dimensions), budget_(budget), seed_(seed), judge_(judge) {}

  SearchOutcome run() {
    scatter();
    if (!over()) climb(nlopt::GN_DIRECT_L, Point(d_, 0.5), std::min(left(), budget_ / 4));
    std::vector<Point> been;
    while (!over() && !flat()) {
      const Point start = next_start(been);
      if (start.empty()) break;
      been.push_back(start);
      const std::size_t share = std::max(left() / 2, 4 * d_ + 4);
      climb(d_ == 1 ? nlopt::LN_SBPLX : nlopt::LN_BOBYQA, start, std::min(left(), share));
      been.push_back(summit_);
    }
    SearchOutcome outcome;
    outcome.evaluations = known_.size();
    outcome.stopped = stopped_;
    outcome.flat = flat();
    for (const auto& [point, value] : known_) {
      if (std::isnan(value) || (!outcome.best.empty() && value <= outcome.value)) continue;
      outcome.best = point;
      outcome.value = value;
    }
    return outcome;
  }

 private:
  [[nodiscard]] std::size_t left() const { return budget_ - known_.size(); }
  [[nodiscard]] bool over() const { return stopped_ || found_worst_ || left() == 0; }

  [[nodiscard]] bool flat() const {
    return known_.size() > 1 && std::all_of(known_.begin(), known_.end(),
                                            [&](const auto& entry) { return entry.second == known_.begin()->second; });
  }

  void evaluate(std::vector<Point> points) {
    std::vector<Point> fresh;
    for (Point& p : points) {
      if (!known_.contains(p) && std::find(fresh.begin(), fresh.end(), p) == fresh.end()) fresh.push_back(std::move(p));
    }
    if (fresh.size() > left()) fresh.resize(left());
    for (std::size_t i = 0; i < fresh.size() && !over(); i += points_at_once)
      judge({fresh.begin() + static_cast<std::ptrdiff_t>(i),
             fresh.begin() + static_cast<std::ptrdiff_t>(std::min(fresh.size(), i + points_at_once))});
  }

  void judge(const std::vector<Point>& points) {
    const std::vector<double> values = judge_(points);
    stopped_ = stopped_ || values.size() < points.size();
    for (std::size_t i = 0; i < values.size(); ++i) {
      known_.emplace(points[i], values[i]);
      found_worst_ = found_worst_ || values[i] == std::numeric_limits<double>::infinity();
      if (!std::isnan(values[i])) least_ = std::isnan(least_) ? values[i] : std::min(least_, values[i]);
    }
  }

  void scatter() {
    const std::size_t share = std::max<std::size_t>(budget_ / 3, 1);
    std::vector<Point> points = {Point(d_, 0.5)};
    const std::size_t corners = d_ < 7 ? std::size_t{1} << d_ : most_corners + 1;
    if (corners <= most_corners && 2 * corners <= share) {
      for (std::size_t c = 0; c < corners; ++c) {
        Point corner(d_);
        for (std::size_t j = 0; j < d_; ++j) corner[j] = (c >> j & 1) != 0 ? 1.0 : 0.0;
        points.push_back(corner);
      }
    }
    if (share > points.size()) {
      Draws sobol(DrawKind::sobol, share - points.size(), d_, seed_);
      for (std::uint64_t k = 0; k < sobol.cases(); ++k) points.push_back(sobol.point(k));
    }
    // Half of what lies between neighbours, about.
    spacing_ = std::clamp(0.5 * exp(-log(static_cast<double>(points.size())) / static_cast<double>(d_)), 0.05, 0.25);
    evaluate(std::move(points));
  }

  // The best point from which no climb has begun or ended nearby; empty where there is none.
  [[nodiscard]] Point next_start(const std::vector<Point>& been) const {
    Point best;
    double value = -std::numeric_limits<double>::infinity();
    for (const auto& [point, v] : known_) {
      const bool near =
          std::any_of(been.begin(), been.end(), [&](const Point& b) { return distance(b, point) < apart; });
      if (!near && v > value) best = point, value = v;
    }
    return best;
  }

  void climb(nlopt::algorithm method, const Point& start, std::size_t share) {
    summit_ = start;
    if (share == 0) return;
    nlopt::opt opt(method, static_cast<unsigned>(d_));
    opt.set_lower_bounds(0.0);
    opt.set_upper_bounds(1.0);
    opt.set_initial_step(spacing_);
    opt.set_xtol_abs(finest_step);
    opt.set_ftol_rel(least_gain);
    share_ends_ = std::max<std::size_t>(left(), share) - share;
    // Where points come up that are known, none of the share is spent: this ends it.
    opt.set_maxeval(static_cast<int>(4 * share + 100));
    opt.set_max_objective([](const Point& x, Point&, void* self) { return static_cast<Search*>(self)->value_at(x); },
                          this);
    Point x = start;
    double value = 0.0;
    try {
      opt.optimize(x, value);
      summit_ = x;
    } catch (const nlopt::forced_stop&) {
    } catch (const nlopt::roundoff_limited&) {
    }
    if (error_) std::rethrow_exception(error_);
  }

  double value_at(const Point& x) {
    if (!known_.contains(x)) {
      if (over() || error_ || left() <= share_ends_) throw nlopt::forced_stop();
      try {
        evaluate({x});
      } catch (...) {  // NLopt would put an exception of its own in its place
        error_ = std::current_exception();
        throw nlopt::forced_stop();
      }
      if (!known_.contains(x)) throw nlopt::forced_stop();
    }
    const double value = known_.at(x);
    return std::isnan(value) ? (std::isnan(least_) ? 0.0 : least_) : value;  // none: as low as any
  }

  std::size_t d_, budget_;
  std::uint64_t seed_;
  const Judge& judge_;
  std::map<Point, double> known_;
  double least_ = std::numeric_limits<double>::quiet_NaN(), spacing_ = 0.25;
  std::size_t share_ends_ = 0;  // how many evaluations are left when this climb's share is spent
  Point summit_;
  std::exception_ptr error_;
  bool stopped_ = false, found_worst_ = false;
};

}  // namespace

SearchOutcome largest_in_cube(std::size_t dimensions, std::size_t budget, std::uint64_t seed, const Judge& judge) {
  return Search(dimensions, budget, seed, judge).run();
}

}  // namespace slipbench
