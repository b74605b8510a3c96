// The true drive: model constants, profiles, drift and process noise, stepped on integer ticks, for one case or for a pack.
//
// Plant step n runs from n h to (n+1) h. Before n = 0 (the run-in of a steady start) profiles and drift stand at their
// first value and there is no noise.
#pragma once

#include <limits>

#include "plant/open_stator.hpp"
#include "sim/engine/lost.hpp"
#include "sim/engine/noise_pack.hpp"
#include "sim/engine/plant_row.hpp"
#include "sim/engine/profile_pack.hpp"
#include "sim/engine/side_by_side.hpp"
#include "sim/engine/steppers.hpp"

namespace slipbench {

// The supply's voltage at the time it was last asked for; NaN equals no time.
template <class Real>
struct SourceAt {
  double time = std::numeric_limits<double>::quiet_NaN();
  Vec2<Real> voltage{};
};

// Everything of one step in one function: the calls of four stages would cost as much as their arithmetic. The supply's
// voltage is reckoned once a time, whether stages or the next step ask again.
template <class Real>
[[gnu::flatten]] void advance(const Drive<Real>& drive, const DriveInput<Real>& input, SourceAt<Real>& known,
                              Stepper method, DriveState<Real>& x, double t, double h) {
  SourceAt<Real> source = known;
  const auto system = [&](const DriveState<Real>& at, DriveState<Real>& dx, double time) {
    if (time != source.time) source = {time, source_voltage(drive, input, time)};
    drive_derivative(drive, input, source.voltage, at, time, dx);
  };
  odeint_step(method, system, x, t, h);
  known = source;
}

template <class Real>
void advance_open(const Drive<Real>& drive, const DriveInput<Real>& input, Stepper method, DriveState<Real>& x,
                  double t, double h) {
  odeint_step(
      method,
      [&](const DriveState<Real>& at, DriveState<Real>& dx, double time) {
        open_drive_derivative(drive, input, at, time, dx);
      },
      x, t, h);
}

template <class Real>
class Plant {
 public:
  explicit Plant(Cases cases);

  void set_state(const MachineFlux<Real>& flux, const Real& speed_rad_s) {
    x_ = {flux.stator.x, flux.stator.y, flux.rotor.x, flux.rotor.y, shape_.speed_imposed ? imposed_at(0) : speed_rad_s,
          x_[5]};
  }
  // Duties that act from now on.
  void apply(const Phases<Real>& duty) {
    duty_ = duty;
    apply_duty(drive_, input_, duty, dc_link_now_);
    source_ = {};
  }
  // All switches open, or enabled again; one run in double only (the engine's packs never open their gates).
  void set_gates(bool enabled) {
    gates_open_ = !enabled;
    if (gates_open_) open_stator();
  }
  [[nodiscard]] bool gates_open() const { return gates_open_; }
  // The period's process noise, added to the state at control tick k > 0.
  void disturb(std::int64_t tick);
  // From n h to (n+1) h.
  void step(std::int64_t n);
  // The truth at n h, just after a jump. References are the controller's business and left NaN.
  PlantRowOf<Real> row(std::int64_t n);
  // Lanes in which this has gone wrong. NaN counts.
  [[nodiscard]] MaskOf<Real> lost(Lost what) const {
    const auto beyond = [](const Real& x, const Real& limit) { return !(fabs(x) <= limit); };
    if (what == Lost::speed) return beyond(x_[4], c_.speed_limit);
    const std::size_t i = what == Lost::stator_flux ? 0 : 2;
    return beyond(x_[i], c_.flux_limit) | beyond(x_[i + 1], c_.flux_limit);
  }

  [[nodiscard]] const DriveState<Real>& state() const { return x_; }
  [[nodiscard]] const Real& speed() const { return x_[4]; }
  [[nodiscard]] const Real& angle() const { return x_[5]; }
  [[nodiscard]] const Real& dc_link() const { return dc_link_now_; }
  [[nodiscard]] const Circuit<Real>& circuit() const { return circuit_now_; }  // with its drift
  [[nodiscard]] Phases<Real> phase_currents() const { return phases_of(stator_current(drive_.machine, flux_of(x_))); }
  [[nodiscard]] Vec2<Real> voltage_at(std::int64_t n) const {
    if (gates_open_) return open_stator_voltage(drive_.machine, flux_of(x_), drive_.machine.pole_pairs * x_[4]);
    const Vec2<Real> source = source_voltage(drive_, input_, static_cast<double>(n) * shape_.step_s);
    return stator_voltage(drive_, input_, source, stator_current(drive_.machine, flux_of(x_)));
  }
  [[nodiscard]] Real load_at_start(const Real& speed) const {  // with friction, at t = 0, N m
    DriveInput<Real> in = input_;
    in.load_profile = {};
    for (ProfilePack<Real> p : loads_) in.load_profile.value = in.load_profile.value + p.line_at(0.0).at(0.0);
    return total_resistance(drive_, in, speed, 0.0);
  }

 private:
  struct Drift {
    Drifting what;
    ProfilePack<Real> factor;
    Real now{};
  };

  void open_stator() {
    const MachineFlux<Real> psi = opened(drive_.machine, flux_of(x_));
    x_[0] = psi.stator.x, x_[1] = psi.stator.y;
  }
  void set_lines(std::int64_t n);
  // The factors at time t, on the line that holds at `on_line_at`: half a step later for the value just after a jump, whatever
  // the rounding of t against the knot.
  void set_drift(double t, double on_line_at);
  // Imposed speed at n h, just after a jump; the first value before n = 0.
  Real imposed_at(std::int64_t n) {
    const double t = static_cast<double>(n > 0 ? n : 0) * shape_.step_s;
    return imposed_.line_at(t + 0.5 * shape_.step_s).at(t);
  }

  PlantShape shape_;
  PlantNumbers<Real> c_;
  Real dc_link_now_;
  Phases<Real> duty_;
  Drive<Real> drive_;
  DriveInput<Real> input_;
  SourceAt<Real> source_;
  DriveState<Real> x_;
  std::vector<ProfilePack<Real>> loads_;
  ProfilePack<Real> imposed_;
  std::vector<Drift> drifts_;
  Circuit<Real> circuit_now_;
  NoisePack<Real> noise_;
  NoiseStream<Real> load_noise_{NoiseChannel("process_load_torque")};
  std::array<NoiseStream<Real>, 2> current_noise_{NoiseStream<Real>(NoiseChannel("process_current_alpha")),
                                                  NoiseStream<Real>(NoiseChannel("process_current_beta"))},
      flux_noise_{NoiseStream<Real>(NoiseChannel("process_flux_alpha")),
                  NoiseStream<Real>(NoiseChannel("process_flux_beta"))};
  double still_from_ = 0.0, still_until_ = 0.0;  // no factor moves between these times
  bool gates_open_ = false;
  bool lines_, load_walks_, current_moves_, flux_moves_;
};

}  // namespace slipbench

#include "sim/engine/plant_steps.hpp"
