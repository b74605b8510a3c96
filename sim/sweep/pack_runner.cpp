#include "sim/sweep/pack_runner.hpp"

#include <algorithm>
#include <atomic>
#include <chrono>
#include <memory>

#include "sim/engine/lanes/ready_cases.hpp"
#include "sim/engine/lanes/run_pack.hpp"
#include "sim/scenario/input_error.hpp"
#include "sim/scenario/nearest.hpp"
#include "sim/score/pack_score.hpp"
#include "sim/sweep/case_run.hpp"

namespace slipbench {

namespace {

// A pack takes about as long as this share of its width would take alone: fewer cases than that are quicker in double.
constexpr double pack_worth = 1.0 / 3.0;
constexpr std::size_t packs_made_ready = 4;
// A turn of a pack: long beside what it costs to change over, short beside a wait that is worth avoiding.
constexpr auto turn = std::chrono::milliseconds(10);
constexpr std::int64_t ticks_between_looks = 256;  // at the clock, and whether to go on

const LaneSet& set_named(const std::string& isa) {
  std::vector<std::string_view> names = {"double"};
  for (const LaneSet& set : lane_sets()) {
    names.push_back(set.name);
    if (set.name != isa) continue;
    if (!set.available()) {
      throw InputError("command line", "--isa",
                       "--isa '" + isa + "': this processor lacks it; the widest that it has is " +
                           std::string(best_lane_set().name),
                       "usage");
    }
    return set;
  }
  std::string list;
  for (const std::string_view name : names) list += (list.empty() ? "" : ", ") + std::string(name);
  throw InputError(
      "command line", "--isa",
      "--isa '" + isa + "': expected one of " + list + "; the nearest is " + std::string(nearest(isa, names)), "usage");
}

}  // namespace

void RanHow::add(const RanHow& more) {
  in_lanes += more.in_lanes;
  simulated_s += more.simulated_s;
  for (const auto& [why, cases] : more.not_in_lanes) not_in_lanes[why] += cases;
}

// The cases of one start(), until the last of them has ended.
class PackRunner::Group : public std::enable_shared_from_this<Group> {
 public:
  Group(const PackRunner& runner, std::vector<PackCase> cases, std::uint32_t noise_run, Work& work, Ended ended)
      : runner_(runner), cases_(std::move(cases)), noise_run_(noise_run), work_(work), ended_(std::move(ended)) {}

  void start() {
    left_ = 1;  // until all are counted
    for (PackCase& one : cases_) {
      const std::string why = runner_.set_ == nullptr ? "asked for" : lanes_can_run(one.scenario);
      if (why.empty())
        waiting_.push_back({&one, {}, false});
      else
        add_alone(one, why);
    }
    // A steady start runs in for seconds: a few packs at a time, so that a stop is heard between them.
    const std::size_t batch = packs_made_ready * runner_.lanes_;
    unready_ = (waiting_.size() + batch - 1) / batch;
    for (std::size_t first = 0; first < waiting_.size(); first += batch)
      add([this, first, last = std::min(first + batch, waiting_.size())] {
        make_ready(first, last);
        return false;
      });
    end_piece();
  }

 private:
  struct Waiting {  // for its pack
    PackCase* one;
    RunSetup setup;
    bool ready;
  };
  struct Pack {
    std::vector<Waiting*> cases;
    std::unique_ptr<PackScore> score;  // from the first turn on
    std::unique_ptr<PackRun> run;
  };

  // `piece` answers whether there is more of it.
  template <class F>
  void add(F piece) {
    ++left_;
    work_.add([self = shared_from_this(), piece = std::move(piece)](std::size_t) {
      if (!self->runner_.keep_going_()) return false;
      if (piece()) return true;
      if (self->runner_.keep_going_()) self->end_piece();  // else it may have been cut short
      return false;
    });
  }
  void end_piece() {
    if (--left_ == 0) ended_(how_);
  }
  template <class F>
  void tell(F change) {
    const std::lock_guard lock(mutex_);
    change(how_);
  }

  void add_alone(PackCase& one, const std::string& why) {
    add([this, &one, why] {
      try {
        run_case(*one.row, one.scenario, noise_run_, runner_.keep_going_);
      } catch (const InputError& error) {
        fill_refused(*one.row, error.message(), 0);
      }
      tell([&](RanHow& how) { how.simulated_s += one.scenario.run.duration_s, how.not_in_lanes[why] += 1; });
      return false;
    });
  }

  void make_ready(std::size_t first, std::size_t last) {
    std::vector<const Scenario*> scenarios;
    for (std::size_t i = first; i < last; ++i) scenarios.push_back(&waiting_[i].one->scenario);
    const std::vector<std::uint32_t> runs(scenarios.size(), noise_run_);
    std::vector<ReadyCase> made = ready_cases(*runner_.set_, scenarios, runs);
    for (std::size_t i = 0; i < made.size(); ++i) {
      Waiting& w = waiting_[first + i];
      w.ready = made[i].refused.empty();
      if (w.ready)
        w.setup = std::move(made[i].setup);
      else
        fill_refused(*w.one->row, made[i].refused, 0);
    }
    if (--unready_ == 0) fill_packs();
  }

  // Cases of one shape fill packs in their order.
  void fill_packs() {
    std::vector<Waiting*> waiting;
    for (Waiting& w : waiting_) {
      if (w.ready) waiting.push_back(&w);
    }
    while (!waiting.empty()) {
      std::vector<Waiting*> pack, rest;
      for (Waiting* w : waiting) {
        const bool fits = pack.size() < runner_.lanes_ && (pack.empty() || w->setup.shape == pack.front()->setup.shape);
        (fits ? pack : rest).push_back(w);
      }
      waiting.swap(rest);
      const bool worth =
          runner_.forced_ || static_cast<double>(pack.size()) > pack_worth * static_cast<double>(runner_.lanes_);
      if (worth) {
        const auto together = std::make_shared<Pack>();
        together->cases = std::move(pack);
        add([this, together] { return go_on(*together); });
      } else {
        for (Waiting* w : pack) add_alone(*w->one, "too few of their kind to fill a pack");
      }
    }
  }

  void begin(Pack& pack) const {
    std::vector<ScoreBasis> bases;
    std::vector<const RunSetup*> setups;
    for (const Waiting* w : pack.cases) {
      bases.push_back(score_basis(w->one->scenario));
      setups.push_back(&w->setup);
    }
    pack.score = std::make_unique<PackScore>(bases, pack.cases.front()->one->scenario.estimators.size());
    pack.run = std::make_unique<PackRun>(*runner_.set_, setups, *pack.score);
  }
  // A turn; true: there is more of it.
  bool go_on(Pack& pack) {
    if (!pack.run) begin(pack);
    const auto until = std::chrono::steady_clock::now() + turn;
    while (!pack.run->go_on(ticks_between_looks)) {
      if (!runner_.keep_going_()) return false;
      if (std::chrono::steady_clock::now() > until) return true;
    }
    const std::vector<RunOutcome> outcomes = pack.run->outcomes();
    double simulated_s = 0.0;
    for (std::size_t i = 0; i < pack.cases.size(); ++i) {
      const PackCase& one = *pack.cases[i]->one;
      fill_row(*one.row, one.scenario, outcomes[i], pack.score->estimators(i), pack.score->drive(i));
      simulated_s += outcomes[i].simulated_s;
    }
    tell([&](RanHow& how) { how.simulated_s += simulated_s, how.in_lanes += pack.cases.size(); });
    return false;
  }

  const PackRunner& runner_;
  std::vector<PackCase> cases_;
  std::uint32_t noise_run_;
  Work& work_;
  Ended ended_;
  std::vector<Waiting> waiting_;
  std::atomic<std::size_t> left_{0}, unready_{0};  // pieces; batches to be made ready
  std::mutex mutex_;
  RanHow how_;
};

PackRunner::PackRunner(const std::string& isa, KeepGoing keep_going)
    : isa_(isa), forced_(!isa.empty()), keep_going_(std::move(keep_going)) {
  if (isa == "double") return;
  set_ = isa.empty() ? &best_lane_set() : &set_named(isa);
  isa_ = set_->name;
  lanes_ = set_->width();
}

void PackRunner::start(std::vector<PackCase> cases, std::uint32_t noise_run, Work& work, Ended ended) const {
  std::make_shared<Group>(*this, std::move(cases), noise_run, work, std::move(ended))->start();
}

void PackRunner::run(std::vector<PackCase> cases, std::uint32_t noise_run) const {
  Work work;
  start(std::move(cases), noise_run, work, [](const RanHow&) {});
  work.finish();
  while (work.run_one(0)) {
  }
}

}  // namespace slipbench
