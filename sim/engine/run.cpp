#include "sim/engine/run.hpp"

#include <algorithm>
#include <chrono>
#include <limits>

#include "sim/engine/clock.hpp"
#include "sim/engine/run_in.hpp"

namespace slipbench {

namespace {

constexpr std::int64_t ticks_between_questions = 4096;  // how often keep_going is asked

DriveLoop<double> loop_of(const RunSetup& setup) {
  const RunSetup* alone = &setup;
  return DriveLoop<double>({&alone, 1});
}

}  // namespace

Run::Run(const Scenario& s, const RunOptions& options, std::int64_t first_tick)
    : options_(options),
      setup_(prepare_run(s, options.noise_run, first_tick)),
      loop_(loop_of(setup_)),
      events_(s),
      step_seconds_(s.estimators.size()) {
  if (options.outside) {
    loop_.add_estimate();
    loop_.take_no_estimates();
    setup_.info.estimator_names.emplace_back(outside_name);
    setup_.info.estimator_kinds.emplace_back(outside_name);
  }
  estimate_row_.resize(setup_.info.estimator_names.size() * estimator_column_count);
}

double Run::run_in() { return slipbench::run_in(loop_, setup_.plant); }

RunSetup Run::onward() const {
  RunSetup on = setup_;
  loop_.save(on, 0);
  on.shape.first_tick = 0;
  return on;
}

void Run::act(const Event& event) {
  switch (event.kind) {
    case Event::Kind::speed_sensor:
      loop_.sensors().set_speed_fault(event.fault, loop_.plant());
      break;
    case Event::Kind::current_sensor:
      loop_.sensors().set_current_fault(event.phase, event.fault);
      break;
    case Event::Kind::speed_from: {
      const auto& names = setup_.info.estimator_names;
      const auto found = std::find(names.begin(), names.end(), event.estimator);
      loop_.take_speed_from(found == names.end() ? -1 : found - names.begin());
      break;
    }
  }
}

void Run::estimate() {
  if (!options_.time_steps) return loop_.estimate();
  ++timed_ticks_;
  for (std::size_t i = 0; i < step_seconds_.size(); ++i) {
    const auto begun = std::chrono::steady_clock::now();
    loop_.estimate(i);
    step_seconds_[i] += std::chrono::duration<double>(std::chrono::steady_clock::now() - begun).count();
  }
}

void Run::control(std::int64_t k) { options_.outside ? control_from_outside(k) : loop_.control(k); }

void Run::control_from_outside(std::int64_t k) {
  loop_.refer(k);
  const bool gates = !loop_.plant().gates_open();
  const OutsideAct act = options_.outside->step({k, loop_.sensors().values(), loop_.sensors().encoder_edges(),
                                                 loop_.speed_reference(), loop_.torque_reference(), gates});
  loop_.set_last_estimate(act.estimate);
  loop_.set_gates(act.gates);
  if (gates && !act.gates && diodes_conduct(loop_.plant().voltage_at(0), loop_.plant().dc_link())) {
    noticed_.push_back(
        {k, static_cast<double>(k) * setup_.shape.control_period_s,
         "the open machine's voltage is above the DC link: its diodes would brake, which is not modelled"});
  }
  Command<double> command;
  command.duty = act.duty;
  command.clipped = act.clipped ? 1.0 : 0.0;
  command.rotor_flux_reference = std::numeric_limits<double>::quiet_NaN();
  loop_.obey(command);
}

std::string text_of(Lost lost, const RunSetup& setup) {
  const auto estimate = [&](std::int64_t which) {
    return "estimate of '" + setup.info.estimator_names.at(static_cast<std::size_t>(which)) +
           "', which closes the loop";
  };
  switch (lost) {
    case Lost::stator_flux:
      return "stator flux of the plant";
    case Lost::rotor_flux:
      return "rotor flux of the plant";
    case Lost::speed:
      return "speed of the plant";
    case Lost::speed_estimate:
      return estimate(setup.shape.control.speed_from);
    case Lost::flux_estimate:
      return estimate(setup.shape.control.flux_from);
    case Lost::command:
      return "voltage command of the controller";
    case Lost::nothing:
      break;
  }
  return {};
}

bool Run::diverged(std::int64_t k) {
  std::array<Lost, 1> lost{};
  if (!loop_.find_lost(true, lost)) return false;
  outcome.diverged = true;
  outcome.diverged_at_s = static_cast<double>(k) * setup_.shape.control_period_s;
  setup_.shape.control = loop_.shape().control;  // an event may have moved the loop to another estimator
  outcome.diverged_what = text_of(lost[0], setup_);
  return true;
}

void Run::fill_estimate_row() {
  auto at = estimate_row_.begin();
  for (const Estimate<double>& e : loop_.estimates()) {
    for (const double x : {e.speed / rad_s_in_rpm, e.rotor_flux, e.rotor_flux_angle, e.torque, e.trust}) *at++ = x;
  }
}

struct Run::Host {
  Run& run;
  std::span<RunObserver* const> observers;
  std::int64_t ticks;
  PlantRow row{};

  void act(std::int64_t k) {
    run.loop_.disturb(k);
    while (const Event* event = run.events_.due(k)) run.act(*event);
    run.loop_.sense(k);
    run.estimate();
    run.control(k);
  }
  void look(std::int64_t n) {
    if (!observers.empty()) row = run.loop_.row(n);
  }
  bool tell_tick(std::int64_t k) {
    const TickView view{k,
                        row[P::time],
                        &row,
                        run.loop_.estimates(),
                        run.loop_.clipped() != 0.0,
                        &run.loop_.sample(),
                        run.loop_.measurement(),
                        run.loop_.command()};
    for (RunObserver* o : observers) o->control_tick(view);
    if (run.diverged(k)) return false;
    const auto& keep_going = run.options_.keep_going;
    if (keep_going && k % ticks_between_questions == 0 &&
        !keep_going(static_cast<double>(k) / static_cast<double>(ticks))) {
      run.outcome.stopped = true;
      return false;
    }
    return true;
  }
  void tell_row(std::int64_t r) {
    if (observers.empty()) return;
    run.fill_estimate_row();
    const RowView view{r, &row, run.loop_.sensors().values(), run.estimate_row_};
    for (RunObserver* o : observers) o->trace_row(view);
  }
  void step(std::int64_t n) { run.loop_.plant_step(n); }
};

void Run::go(std::span<RunObserver* const> observers) {
  const RunShape& shape = setup_.shape;
  const std::int64_t ticks = std::max<std::int64_t>(shape.steps / shape.steps_per_control, 1);
  const std::int64_t n = run_clock(shape, Host{*this, observers, ticks});
  outcome.simulated_s = static_cast<double>(n) * shape.plant.step_s;
  outcome.clipped_samples = static_cast<std::int64_t>(loop_.sensors().clipped());
  outcome.events = events_.acted();
  if (options_.outside) {
    for (const ActedEvent& e : options_.outside->events()) outcome.events.push_back(e);
    for (const ActedEvent& e : noticed_) outcome.events.push_back(e);
    std::stable_sort(outcome.events.begin(), outcome.events.end(),
                     [](const ActedEvent& a, const ActedEvent& b) { return a.tick < b.tick; });
  }
  for (const double seconds : step_seconds_)
    outcome.step_ns.push_back(timed_ticks_ > 0 ? seconds / static_cast<double>(timed_ticks_) * 1e9
                                               : std::numeric_limits<double>::quiet_NaN());
}

}  // namespace slipbench
