#include "sim/engine/lanes/run_pack.hpp"

#include <array>
#include <chrono>
#include <exception>
#include <limits>
#include <new>
#include <stdexcept>

#include "sim/engine/run.hpp"

namespace slipbench {

namespace {

// The C side of an observer: what it throws waits here until the unit has returned.
struct Relay {
  PackObserver& observer;
  Cases cases;
  std::vector<RunOutcome>& outcomes;
  PackView view;
  std::vector<std::uint8_t> lanes;
  std::exception_ptr thrown;

  template <class F>
  bool guarded(const LanesView* seen, F call) noexcept {
    if (thrown) return false;
    try {
      static_cast<LanesView&>(view) = *seen;
      return call();
    } catch (...) {
      thrown = std::current_exception();
      return false;
    }
  }
  static bool tick(void* self, const LanesView* seen) {
    Relay& relay = *static_cast<Relay*>(self);
    return relay.guarded(seen, [&] {
      relay.observer.control_tick(relay.view);
      return relay.observer.keep_going(seen->index);
    });
  }
  static void row(void* self, const LanesView* seen) {
    Relay& relay = *static_cast<Relay*>(self);
    relay.guarded(seen, [&] {
      relay.observer.trace_row(relay.view);
      return true;
    });
  }
  static void lost(void* self, std::size_t lane, std::int64_t tick, std::int32_t what) {
    Relay& relay = *static_cast<Relay*>(self);
    relay.guarded(&relay.view, [&] {
      const RunShape& shape = relay.cases[lane]->shape;
      RunOutcome& outcome = relay.outcomes[lane];
      outcome.diverged = true;
      outcome.diverged_at_s = static_cast<double>(tick) * shape.control_period_s;
      outcome.diverged_what = text_of(static_cast<Lost>(what), *relay.cases[lane]);
      outcome.simulated_s = static_cast<double>(tick * shape.steps_per_control) * shape.plant.step_s;
      relay.lanes[lane] = 0;
      relay.observer.lost(lane, tick, static_cast<Lost>(what));
      return true;
    });
  }
};

void demand_fit(const LaneSet& set, Cases cases) {
  if (!set.available()) throw std::logic_error("this processor lacks the instruction set of the lanes asked for");
  if (cases.empty() || cases.size() > set.width()) throw std::logic_error("a pack holds one case to as many as lanes");
  for (const RunSetup* one : cases) {
    if (one->shape != cases[0]->shape) throw std::logic_error("cases of different shapes in one pack");
    for (const auto& own : one->own_estimators)
      if (own) throw std::logic_error("a program's own estimator cannot run in lanes");
    if (one->own_controller) throw std::logic_error("a program's own controller cannot run in lanes");
  }
}

// Tells each lane's observers what they would hear of a run alone.
class PerLane : public PackObserver {
 public:
  PerLane(Cases cases, std::span<const std::vector<RunObserver*>> observers, const std::function<bool()>& keep_going)
      : observers_(observers),
        keep_going_(keep_going),
        estimates_(cases[0]->estimators.size()),
        estimate_row_(estimates_.size() * estimator_column_count),
        measured_(cases[0]->info.measured.size()) {}

  [[nodiscard]] bool wants_rows() const override { return true; }
  [[nodiscard]] bool keep_going(std::int64_t tick) override {
    constexpr std::int64_t ticks_between = 64;
    return !keep_going_ || tick % ticks_between != 0 || keep_going_();
  }
  void control_tick(const PackView& view) override {
    each_lane(view, [&](std::size_t lane, auto& told) {
      const TickView tick{view.index, view.time_s, &plant_, estimates_, view.clipped[lane] != 0.0};
      for (RunObserver* o : told) o->control_tick(tick);
    });
  }
  void trace_row(const PackView& view) override {
    each_lane(view, [&](std::size_t lane, auto& told) {
      auto at = estimate_row_.begin();
      for (const Estimate<double>& e : estimates_) {
        for (const double x : {e.speed / rad_s_in_rpm, e.rotor_flux, e.rotor_flux_angle, e.torque, e.trust}) *at++ = x;
      }
      for (std::size_t i = 0; i < measured_.size(); ++i) measured_[i] = view.measured[i * view.width + lane];
      const RowView row{view.index, &plant_, measured_, estimate_row_};
      for (RunObserver* o : told) o->trace_row(row);
    });
  }

 private:
  template <class F>
  void each_lane(const PackView& view, F tell) {
    for (std::size_t lane = 0; lane < view.lanes.size(); ++lane) {
      if (view.lanes[lane] == 0 || observers_[lane].empty()) continue;
      for (std::size_t c = 0; c < plant_.size(); ++c) plant_[static_cast<P>(c)] = view.plant[c * view.width + lane];
      for (std::size_t e = 0; e < estimates_.size(); ++e) {
        const double* from = view.estimate(e, 0) + lane;
        each_number(estimates_[e], [&](double& x) { x = *from, from += view.width; });
      }
      tell(lane, observers_[lane]);
    }
  }

  std::span<const std::vector<RunObserver*>> observers_;
  const std::function<bool()>& keep_going_;
  PlantRow plant_{};
  std::vector<Estimate<double>> estimates_;
  std::vector<double> estimate_row_, measured_;
};

}  // namespace

struct PackRun::Whole {
  const LaneSet& set;
  std::vector<const RunSetup*> cases, filled;
  std::vector<RunOutcome> outcomes;
  std::vector<double> clipped;
  Relay relay;
  LanesSink sink;
  LanesRun run;
  LanesJob job;
  double wall_s = 0.0;

  Whole(const LaneSet& lane_set, Cases all, PackObserver& observer)
      : set(lane_set),
        cases(all.begin(), all.end()),
        filled(cases),
        outcomes(cases.size()),
        clipped(set.width()),
        relay{observer, cases, outcomes, {}, std::vector<std::uint8_t>(cases.size(), 1), {}},
        sink{&relay, observer.wants_rows(), Relay::tick, Relay::row, Relay::lost} {
    // Lanes that have no case of their own run the last one again, told to nobody.
    filled.resize(set.width(), cases.back());
    relay.view.width = set.width();
    relay.view.lanes = relay.lanes;
    run.cases = filled.data();
    run.used = cases.size();
    run.sink = &sink;
    run.clipped_samples = clipped.data();
    job.drive = &run;
  }
  ~Whole() {
    job.work = LanesWork::drop;
    set.run(&job);
  }
};

PackRun::PackRun(const LaneSet& set, Cases cases, PackObserver& observer) {
  demand_fit(set, cases);
  whole_ = std::make_unique<Whole>(set, cases, observer);
}

PackRun::~PackRun() = default;

bool PackRun::go_on(std::int64_t ticks) {
  demand_denormals();
  Whole& w = *whole_;
  if (w.run.over) return true;
  const auto begun = std::chrono::steady_clock::now();
  w.job.work = LanesWork::run;
  w.run.ticks = ticks;
  w.set.run(&w.job);
  w.wall_s += std::chrono::duration<double>(std::chrono::steady_clock::now() - begun).count();
  if (w.relay.thrown) std::rethrow_exception(w.relay.thrown);
  if (w.run.failed) throw std::bad_alloc();
  return w.run.over;
}

std::vector<RunOutcome> PackRun::outcomes() const {
  const Whole& w = *whole_;
  const RunShape& shape = w.cases[0]->shape;
  std::vector<RunOutcome> outcomes = w.outcomes;
  for (std::size_t lane = 0; lane < outcomes.size(); ++lane) {
    RunOutcome& outcome = outcomes[lane];
    outcome.wall_s = w.wall_s / static_cast<double>(outcomes.size());
    outcome.clipped_samples = static_cast<std::int64_t>(w.clipped[lane]);
    if (outcome.diverged) continue;
    outcome.simulated_s = static_cast<double>(w.run.ended_at_step) * shape.plant.step_s;
    outcome.stopped = w.run.ended_at_step < shape.steps;
  }
  return outcomes;
}

std::vector<RunOutcome> run_pack(const LaneSet& set, Cases cases, PackObserver& observer) {
  PackRun run(set, cases, observer);
  run.go_on(std::numeric_limits<std::int64_t>::max());
  return run.outcomes();
}

std::vector<RunOutcome> run_pack(const LaneSet& set, Cases cases, std::span<const std::vector<RunObserver*>> observers,
                                 const std::function<bool()>& keep_going) {
  PerLane per_lane(cases, observers, keep_going);
  for (std::size_t lane = 0; lane < cases.size(); ++lane) {
    for (RunObserver* o : observers[lane]) o->begin(cases[lane]->info);
  }
  std::vector<RunOutcome> outcomes = run_pack(set, cases, per_lane);
  for (const auto& told : observers) {
    for (RunObserver* o : told) o->end();
  }
  return outcomes;
}

std::string lanes_can_run(const Scenario& s) {
  if (!s.events.empty()) return "timed events";
  if (s.on_mains() ? false : s.supply.model != "averaged") return "the switched inverter";
  for (const EstimatorSettings& e : s.estimators) {
    if (!is_built_in_estimator(e.kind)) return "an estimator from outside ('" + e.name + "')";
  }
  if (!s.on_mains() && !is_built_in_controller(s.controller.kind)) return "a controller from outside";
  return {};
}

}  // namespace slipbench
