#include "sim/sweep/pack_runner.hpp"

#include <algorithm>

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

PackRunner::PackRunner(const std::string& isa, std::function<bool()> keep_going)
    : isa_(isa), forced_(!isa.empty()), keep_going_(std::move(keep_going)) {
  if (isa == "double") return;
  set_ = isa.empty() ? &best_lane_set() : &set_named(isa);
  isa_ = set_->name;
  lanes_ = set_->width();
}

void PackRunner::run_alone(PackCase& one, std::uint32_t noise_run, const std::string& why) {
  try {
    run_case(*one.row, one.scenario, noise_run, keep_going_);
  } catch (const InputError& error) {
    fill_refused(*one.row, error.message(), 0);
  }
  simulated_s_ += one.scenario.run.duration_s;
  not_in_lanes_[why] += 1;
}

void PackRunner::run_together(const std::vector<Ready*>& pack) {
  std::vector<ScoreBasis> bases;
  std::vector<const RunSetup*> setups;
  for (const Ready* ready : pack) {
    bases.push_back(score_basis(ready->one->scenario));
    setups.push_back(&ready->setup);
  }
  PackScore score(bases, pack.front()->one->scenario.estimators.size(), keep_going_);
  const std::vector<RunOutcome> outcomes = run_pack(*set_, setups, score);
  for (std::size_t i = 0; i < pack.size(); ++i) {
    fill_row(*pack[i]->one->row, pack[i]->one->scenario, outcomes[i], score.estimators(i), score.drive(i));
    simulated_s_ += outcomes[i].simulated_s;
  }
  in_lanes_ += pack.size();
}

void PackRunner::run(std::vector<PackCase>& cases, std::uint32_t noise_run) {
  std::vector<PackCase*> for_lanes;
  for (PackCase& one : cases) {
    if (!keep_going_()) return;
    const std::string why = set_ == nullptr ? "asked for" : lanes_can_run(one.scenario);
    if (why.empty())
      for_lanes.push_back(&one);
    else
      run_alone(one, noise_run, why);
  }
  // A steady start runs in for seconds: a few packs at a time, so that a stop is heard between them.
  const std::vector<std::uint32_t> runs(packs_made_ready * lanes_, noise_run);
  std::vector<Ready> ready;
  ready.reserve(for_lanes.size());
  for (std::size_t first = 0; first < for_lanes.size() && keep_going_(); first += runs.size()) {
    const std::size_t count = std::min(runs.size(), for_lanes.size() - first);
    std::vector<const Scenario*> scenarios;
    for (std::size_t i = 0; i < count; ++i) scenarios.push_back(&for_lanes[first + i]->scenario);
    std::vector<ReadyCase> made = ready_cases(*set_, scenarios, std::span(runs).first(count));
    for (std::size_t i = 0; i < count; ++i) {
      PackCase* one = for_lanes[first + i];
      if (made[i].refused.empty())
        ready.push_back({one, std::move(made[i].setup)});
      else
        fill_refused(*one->row, made[i].refused, 0);
    }
  }
  // Cases of one shape fill packs in their order.
  std::vector<Ready*> waiting;
  for (Ready& r : ready) waiting.push_back(&r);
  while (!waiting.empty() && keep_going_()) {
    std::vector<Ready*> pack, rest;
    for (Ready* r : waiting) {
      const bool fits = pack.size() < lanes_ && (pack.empty() || r->setup.shape == pack.front()->setup.shape);
      (fits ? pack : rest).push_back(r);
    }
    waiting.swap(rest);
    const bool worth = forced_ || static_cast<double>(pack.size()) > pack_worth * static_cast<double>(lanes_);
    if (worth) {
      run_together(pack);
    } else {
      for (Ready* r : pack) run_alone(*r->one, noise_run, "too few of their kind to fill a pack");
    }
  }
}

}  // namespace slipbench
