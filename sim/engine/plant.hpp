// The true drive of a scenario: model constants, profiles, drift and process noise, stepped on integer ticks.
//
// Plant step n runs from n h to (n+1) h. Before n = 0 (the run-in of a steady start) profiles and drift stand at their
// first value and there is no noise.
#pragma once

#include <cstdint>
#include <limits>
#include <vector>

#include "plant/drive.hpp"
#include "plant/profile.hpp"
#include "sim/engine/columns.hpp"
#include "sim/engine/noise.hpp"
#include "sim/engine/steppers.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

// The supply's voltage at the time it was last asked for; NaN equals no time.
struct SourceAt {
  double time = std::numeric_limits<double>::quiet_NaN();
  Vec2<double> voltage{};
};

class Plant {
 public:
  Plant(const Scenario& scenario, std::uint32_t noise_run);

  void set_state(const MachineFlux<double>& flux, double speed_rad_s);
  // Duties that act from now on.
  void apply(const Phases<double>& duty);
  // The period's process noise, added to the state at control tick k > 0.
  void disturb(std::int64_t tick);
  // From n h to (n+1) h.
  void step(std::int64_t n);

  // The truth at n h, just after a jump. References are the controller's business and left NaN.
  [[nodiscard]] PlantRow row(std::int64_t n);
  // What the first thing gone wrong is called; nullptr while all is well.
  [[nodiscard]] const char* diverged() const;

  [[nodiscard]] const DriveState<double>& state() const { return x_; }
  [[nodiscard]] double speed() const { return x_[4]; }
  [[nodiscard]] double angle() const { return x_[5]; }
  [[nodiscard]] double dc_link() const { return dc_link_now_; }
  [[nodiscard]] const Circuit<double>& circuit() const { return circuit_now_; }  // with its drift
  [[nodiscard]] Phases<double> phase_currents() const { return phases_of(stator_current(drive_.machine, flux_of(x_))); }
  [[nodiscard]] Vec2<double> voltage_at(std::int64_t n) const;
  [[nodiscard]] double load_at_start(double speed) const;  // with friction, at t = 0, N m

 private:
  struct Drift {
    double Circuit<double>::*circuit = nullptr;  // or one of the others below
    bool inertia = false, dc_link = false;
    Profile factor;
    double now = 1.0;
  };

  void set_lines(std::int64_t n);
  // The factors at time t, on the line that holds at `on_line_at`: half a step later for the value just after a jump, whatever
  // the rounding of t against the knot.
  void set_drift(double t, double on_line_at);
  // Imposed speed at n h, just after a jump; the first value before n = 0.
  double imposed_at(std::int64_t n);

  Circuit<double> circuit_;
  double inertia_ = 0.0, dc_link_ = 0.0, dc_link_now_ = 0.0, step_s_ = 0.0;
  Phases<double> duty_{0.5, 0.5, 0.5};
  double flux_limit_ = 0.0, speed_limit_ = 0.0;
  Stepper method_ = Stepper::rk4;
  Drive<double> drive_;
  DriveInput<double> input_;
  SourceAt source_;
  DriveState<double> x_{};
  std::vector<Profile> loads_;
  Profile imposed_;
  std::vector<Drift> drifts_;
  Circuit<double> circuit_now_;

  ProcessNoiseSettings process_noise_;
  double walk_per_tick_ = 0.0;
  Noise noise_;
};

}  // namespace slipbench
