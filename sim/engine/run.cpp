#include "sim/engine/run.hpp"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <stdexcept>

#include "sim/engine/start.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

constexpr double rad_s_per_rpm = 3.14159265358979323846 / 30.0;
constexpr double nan = std::numeric_limits<double>::quiet_NaN();
constexpr std::int64_t ticks_between_questions = 4096;  // how often keep_going is asked

std::int64_t whole(double quotient) { return std::llround(quotient); }

}  // namespace

Run::Run(const Scenario& s, const RunOptions& options, std::int64_t first_tick)
    : scenario_(s),
      options_(options),
      first_tick_(first_tick),
      steps_per_control_(whole(s.run.control_period_s / s.run.plant_step_s)),
      steps_per_trace_(whole(s.run.trace_period_s / s.run.plant_step_s)),
      steps_(whole(s.run.duration_s / s.run.trace_period_s) * steps_per_trace_),
      plant_(s, options.noise_run),
      sensors_(s, options.noise_run),
      events_(s) {
  speed_control_ = !s.reference.speed_rpm.empty();
  speed_reference_ = Profile(s.reference.speed_rpm, rad_s_per_rpm);
  torque_reference_ = Profile(s.reference.torque_Nm, 1.0);
  estimates_.resize(s.estimators.size());
  estimate_row_.resize(s.estimators.size() * estimator_column_count);
  step_seconds_.resize(s.estimators.size());
  const double dead_time = s.supply.dead_time_s * s.belief.dead_time,
               drop = s.supply.device_drop_V * s.belief.device_drop;
  compensated_ = !s.on_mains() && s.controller.dead_time_compensation && (dead_time > 0.0 || drop > 0.0);
  if (!s.on_mains())
    believed_leg_ = leg_error(dead_time, s.supply.switching_frequency_Hz, drop, s.supply.zero_current_width_A);
  modulation_ = s.supply.modulation == "sine"            ? Modulation::sine
                : s.supply.modulation == "discontinuous" ? Modulation::discontinuous
                                                         : Modulation::space_vector;
  speed_from_ = closing_estimator(s.controller.speed_from);
  flux_from_ = closing_estimator(s.controller.flux_from);
  place_at_start();
}

std::int64_t Run::closing_estimator(const std::string& name) const {
  for (std::size_t i = 0; i < scenario_.estimators.size(); ++i) {
    if (scenario_.estimators[i].name == name) return static_cast<std::int64_t>(i);
  }
  return -1;
}

void Run::place_at_start() {
  const Scenario& s = scenario_;
  const StartState start = start_state(s, plant_, first_tick_);
  EstimatorSetup e = estimator_setup(s, sensors_.current_noise());
  duty_ = {0.5, 0.5, 0.5};
  if (start.excited) {
    plant_.set_state(start.flux, start.speed);
    e.start_rotor_flux_Wb = magnitude(start.flux.rotor);
    e.start_speed_rad_s = plant_.speed();
    if (!s.on_mains()) duty_ = modulate(modulation_, start.voltage, plant_.dc_link());
  }
  for (const auto& estimator : s.estimators) {
    try {
      estimators_.push_back(make_estimator(estimator.kind, e, estimator.settings));
    } catch (const std::invalid_argument& unfit) {
      const std::string what = "estimator '" + estimator.name + "' cannot be set up: " + unfit.what();
      throw InputError(s.path, "estimator." + std::to_string(estimators_.size()), what, "estimator");
    }
  }
  if (!s.on_mains()) {
    ControllerSetup c = controller_setup(s, modulation_, compensated_, speed_from_ >= 0);
    c.start_rotor_flux_Wb = e.start_rotor_flux_Wb;
    c.start_speed_rad_s = e.start_speed_rad_s;
    try {
      controller_ = make_controller(s.controller.kind, c, s.controller.settings);
    } catch (const std::invalid_argument& unfit) {
      throw InputError(s.path, "controller", std::string("the controller cannot be set up: ") + unfit.what(),
                       "controller");
    }
    pending_.assign(static_cast<std::size_t>(s.controller.delay_periods), duty_);
  }
  plant_.apply(duty_);
  sensors_.begin(plant_, first_tick_ * steps_per_control_);
  reading_ = sensors_.read(plant_, first_tick_ - 1);
}

RunInfo Run::info() const {
  RunInfo info{scenario_.title,
               scenario_.run.trace_period_s,
               scenario_.run.control_period_s,
               scenario_.run.duration_s,
               plant_columns(),
               sensors_.columns(),
               {},
               {}};
  for (const auto& e : scenario_.estimators) {
    info.estimator_names.push_back(e.name);
    info.estimator_kinds.push_back(e.kind);
  }
  return info;
}

Vec2<double> Run::believed_voltage(const Reading& before, const Reading& now, std::int64_t k) const {
  if (scenario_.on_mains()) {
    const bool just_switched_on = k == 0 && scenario_.run.start == "standstill";
    return just_switched_on ? Vec2<double>{} : 0.5 * (before.voltage + now.voltage);
  }
  const double dc_link = 0.5 * (before.dc_link + now.dc_link);
  if (!compensated_) return applied_voltage(duty_, dc_link);
  return averaged_voltage(believed_leg_, phases_of(0.5 * (before.current + now.current)), duty_, dc_link);
}

void Run::run_estimators(std::int64_t k) {
  const Reading before = reading_;
  reading_ = sensors_.read(plant_, k);
  const Vec2<double> u = believed_voltage(before, reading_, k);
  Sample<double> sample;
  sample.tick = k;
  sample.u_alpha = u.x;
  sample.u_beta = u.y;
  sample.i_alpha = reading_.current.x;
  sample.i_beta = reading_.current.y;
  sample.dc_link = reading_.dc_link;
  sample.speed = reading_.speed;
  if (!options_.time_steps) {
    for (std::size_t i = 0; i < estimators_.size(); ++i) estimates_[i] = estimators_[i]->step(sample);
    return;
  }
  ++timed_ticks_;
  for (std::size_t i = 0; i < estimators_.size(); ++i) {
    const auto begun = std::chrono::steady_clock::now();
    estimates_[i] = estimators_[i]->step(sample);
    step_seconds_[i] += std::chrono::duration<double>(std::chrono::steady_clock::now() - begun).count();
  }
}

void Run::act(const Event& event) {
  switch (event.kind) {
    case Event::Kind::speed_sensor:
      sensors_.set_speed_fault(event.fault, plant_);
      break;
    case Event::Kind::current_sensor:
      sensors_.set_current_fault(event.phase, event.fault);
      break;
    case Event::Kind::speed_from:
      speed_from_ = closing_estimator(event.estimator);
      break;
  }
}

void Run::control_tick(std::int64_t k) {
  plant_.disturb(k);
  while (const Event* event = events_.due(k)) act(*event);
  run_estimators(k);
  if (!controller_) return;
  const double t = static_cast<double>(std::max<std::int64_t>(k, 0)) * scenario_.run.control_period_s;
  // Just after a jump, whatever the rounding of t against the knot.
  const auto now = [&](Profile& p) { return p.line_at(t + 0.5 * scenario_.run.plant_step_s).at(t); };
  speed_reference_now_ = now(speed_reference_);
  torque_reference_now_ = now(torque_reference_);
  Measurement<double> m;
  m.tick = k;
  m.current = reading_.current;
  m.dc_link = reading_.dc_link;
  m.speed = speed_from_ < 0 ? reading_.speed : estimates_[static_cast<std::size_t>(speed_from_)].speed;
  if (flux_from_ >= 0) {
    m.rotor_flux = estimates_[static_cast<std::size_t>(flux_from_)].rotor_flux;
    m.rotor_flux_angle = estimates_[static_cast<std::size_t>(flux_from_)].rotor_flux_angle;
  }
  m.speed_reference = speed_reference_now_;
  m.torque_reference = torque_reference_now_;
  command_ = controller_->step(m);
  // The command leaves now and acts d periods later.
  duty_ = command_.duty;
  if (!pending_.empty()) {
    std::swap(duty_, pending_[next_pending_]);
    next_pending_ = next_pending_ + 1 == pending_.size() ? 0 : next_pending_ + 1;
  }
  plant_.apply(duty_);
}

PlantRow Run::plant_row(std::int64_t n) {
  PlantRow row = plant_.row(n);
  if (controller_) {
    if (speed_control_) row[P::speed_reference_rpm] = speed_reference_now_ / rad_s_per_rpm;
    row[P::rotor_flux_reference] = command_.rotor_flux_reference;
  }
  return row;
}

bool Run::find_divergence(std::int64_t k) {
  const auto found = [&](std::string what) {
    outcome.diverged = true;
    outcome.diverged_at_s = static_cast<double>(k) * scenario_.run.control_period_s;
    outcome.diverged_what = std::move(what);
    return true;
  };
  if (const char* what = plant_.diverged()) return found(what);
  if (!controller_) return false;
  for (const std::int64_t i : {speed_from_, flux_from_}) {
    if (i < 0) continue;
    const Estimate<double>& e = estimates_[static_cast<std::size_t>(i)];
    if (!is_finite(e.speed + e.rotor_flux + e.rotor_flux_angle)) {
      return found("estimate of '" + scenario_.estimators[static_cast<std::size_t>(i)].name +
                   "', which closes the loop");
    }
  }
  if (!is_finite(command_.duty.a + command_.duty.b + command_.duty.c))
    return found("voltage command of the controller");
  return false;
}

void Run::plant_steps(std::int64_t n, std::int64_t count) {
  for (std::int64_t i = n; i < n + count; ++i) {
    plant_.step(i);
    sensors_.track(plant_, i + 1);
  }
}

double Run::run_in() {
  const std::int64_t window = std::max<std::int64_t>(1, -first_tick_ / 4);
  const Nameplate plate = scenario_.machine.nameplate();
  std::array<std::vector<double>, 2> means;
  const double speed_scale = 1.0 / plate.speed_rad_s(), flux_scale = plate.angular_frequency() / plate.phase_peak_V();
  for (auto& m : means) m.assign(3 + 2 * estimates_.size(), 0.0);
  for (std::int64_t k = first_tick_; k < 0; ++k) {
    control_tick(k);
    if (find_divergence(k)) return std::numeric_limits<double>::infinity();
    if (k >= -2 * window) {
      auto& m = means[k >= -window ? 1 : 0];
      const PlantRow row = plant_row(k * steps_per_control_);
      m[0] += row[P::speed_rpm] * rad_s_per_rpm * speed_scale;
      m[1] += row[P::rotor_flux] * flux_scale;
      m[2] += row[P::torque] / plate.torque_Nm;
      for (std::size_t i = 0; i < estimates_.size(); ++i) {
        m[3 + 2 * i] += estimates_[i].speed * speed_scale;
        m[4 + 2 * i] += estimates_[i].rotor_flux * flux_scale;
      }
    }
    plant_steps(k * steps_per_control_, steps_per_control_);
  }
  double moving = 0.0;
  for (std::size_t i = 0; i < means[0].size(); ++i) {
    moving = std::max(moving, std::fabs(means[1][i] - means[0][i]) / static_cast<double>(window));
  }
  return moving;
}

void Run::go(std::span<RunObserver* const> observers) {
  const std::int64_t ticks = steps_ / steps_per_control_;
  PlantRow row{};
  std::int64_t k = -1, trace_rows = -1, to_control = 0,
               to_trace = 0;  // counted, since dividing costs as much as a stage
  std::int64_t n = 0;
  for (;; ++n, --to_control, --to_trace) {
    const bool control = to_control == 0, trace = to_trace == 0;
    if (control) {
      to_control = steps_per_control_;
      control_tick(++k);
    }
    if (trace) {
      to_trace = steps_per_trace_;
      ++trace_rows;
    }
    if ((control || trace) && !observers.empty()) row = plant_row(n);
    if (control) {
      const TickView view{k, row[P::time], &row, estimates_, command_.clipped != 0.0};
      for (RunObserver* o : observers) o->control_tick(view);
      if (find_divergence(k)) break;
      if (options_.keep_going && k % ticks_between_questions == 0 &&
          !options_.keep_going(static_cast<double>(k) / static_cast<double>(std::max<std::int64_t>(ticks, 1)))) {
        outcome.stopped = true;
        break;
      }
    }
    if (trace && !observers.empty()) {
      for (std::size_t i = 0; i < estimates_.size(); ++i) {
        const Estimate<double>& e = estimates_[i];
        const std::array<double, estimator_column_count> columns{e.speed / rad_s_per_rpm, e.rotor_flux,
                                                                 e.rotor_flux_angle, e.torque, e.trust};
        std::copy(columns.begin(), columns.end(),
                  estimate_row_.begin() + static_cast<std::ptrdiff_t>(i * columns.size()));
      }
      const RowView view{trace_rows, &row, sensors_.values(), estimate_row_};
      for (RunObserver* o : observers) o->trace_row(view);
    }
    if (n == steps_) break;
    plant_steps(n, 1);
  }
  outcome.simulated_s = static_cast<double>(n) * scenario_.run.plant_step_s;
  outcome.clipped_samples = sensors_.clipped();
  outcome.events = events_.acted();
  outcome.step_ns.assign(step_seconds_.size(), 0.0);
  for (std::size_t i = 0; i < step_seconds_.size(); ++i) {
    outcome.step_ns[i] = timed_ticks_ > 0 ? step_seconds_[i] / static_cast<double>(timed_ticks_) * 1e9 : nan;
  }
}

}  // namespace slipbench
