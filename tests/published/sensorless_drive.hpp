// A published machine on an inverter under rotor-flux-oriented control, every built-in estimator alongside or in the loop.
#pragma once

#include <algorithm>
#include <array>
#include <cmath>
#include <string>
#include <vector>

#include "plant/steady_state.hpp"
#include "sim/engine/simulate.hpp"
#include "tests/published/machines.hpp"

namespace slipbench::published {

inline constexpr std::array<const char*, 3> all_estimators{"luenberger", "reduced_order", "extended_kalman"};
inline constexpr double pi = 3.14159265358979323846;

inline double rated_flux(const Published& p) {
  return magnitude(
      steady_at_slip(p.circuit, p.line_voltage * std::sqrt(2.0 / 3.0), 2.0 * pi * p.frequency, p.slip).flux.rotor);
}

// Magnetised, ramped to `speed_share` of rated speed by 1.2 s; the torque step comes at 1.8 s, the end at 3.5 s.
// DC link 1.35 times the line voltage (mean of a six-pulse rectifier), 10 kHz, dead time 2 us and 1 V drop, both believed and
// compensated; current noise 1 % of rated peak in each of three phases.
inline Scenario inverter_drive(const Published& p, double speed_share, double torque_Nm,
                               const std::string& speed_from) {
  Scenario s = on_mains(p, 3.5, 20e-6);
  const double peak_current = p.current_rms * std::sqrt(2.0);
  s.run.control_period_s = 100e-6;
  s.run.start = "magnetised";
  s.supply = {};
  s.supply.kind = "inverter";
  s.supply.dc_link_V = 1.35 * p.line_voltage;
  s.supply.switching_frequency_Hz = 10e3;
  s.supply.dead_time_s = 2e-6;
  s.supply.device_drop_V = 1.0;
  s.supply.zero_current_width_A = 0.03 * peak_current;
  s.sensors.current.present = s.sensors.dc_link.present = true;
  s.sensors.current.noise = 0.01 * peak_current;
  s.sensors.speed.kind = speed_from == "measured" ? "ideal" : "none";
  s.controller.kind = "rotor_flux_oriented";
  s.controller.speed_from = speed_from;
  s.reference.rotor_flux_Wb = rated_flux(p);
  s.reference.speed_rpm = {{0.0, 0.0}, {0.2, 0.0}, {1.2, p.speed_rpm * speed_share}};
  LoadSettings load;
  load.kind = "profile";
  load.torque_profile = {{0.0, 0.0}, {1.8, 0.0}, {1.8, torque_Nm}};
  s.loads.push_back(load);
  for (const char* kind : all_estimators) {
    EstimatorSettings e;
    e.name = e.kind = kind;
    s.estimators.push_back(e);
  }
  return s;
}

// Errors of each estimator, as shares of rated speed: steady over the last 0.7 s, and over 0.5 s after the torque step.
class ErrorWatch : public RunObserver {
 public:
  explicit ErrorWatch(double rated_rpm) : rated_(rated_rpm * pi / 30.0) {}
  void begin(const RunInfo& info) override {
    const std::size_t n = info.estimator_names.size();
    mean.assign(n, 0.0);
    worst.assign(n, 0.0);
    step_rms.assign(n, 0.0);
  }
  void control_tick(const TickView& v) override {
    const double truth = (*v.plant)[P::speed_rpm] * pi / 30.0;
    const bool steady = v.time_s >= 2.8, stepped = v.time_s >= 1.8 && v.time_s < 2.3;
    steady_ticks_ += steady;
    step_ticks_ += stepped;
    for (std::size_t i = 0; i < v.estimates.size(); ++i) {
      const double error = (v.estimates[i].speed - truth) / rated_;
      if (steady) {
        mean[i] += error;
        worst[i] = std::fabs(error) <= worst[i] ? worst[i] : std::fabs(error);  // a NaN is kept
      }
      if (stepped) step_rms[i] += error * error;
    }
    if (steady) {
      stator_frequency += (*v.plant)[P::stator_frequency];
      speed += truth;
    }
  }
  void end() override {
    const double n = static_cast<double>(steady_ticks_);
    for (std::size_t i = 0; i < mean.size(); ++i) {
      mean[i] /= n;
      step_rms[i] = std::sqrt(step_rms[i] / static_cast<double>(step_ticks_));
    }
    stator_frequency /= n;
    speed /= n;
  }
  std::vector<double> mean, worst, step_rms;
  double stator_frequency = 0.0;  // Hz, mean
  double speed = 0.0;             // mean mechanical, rad/s

 private:
  double rated_;
  std::int64_t steady_ticks_ = 0, step_ticks_ = 0;
};

}  // namespace slipbench::published
