// A small drive to try estimators on: machine and shaft in Runge-Kutta sub-steps, a voltage held over each
// control period, noisy currents, indirect rotor-flux orientation with a speed loop. Control computed at k
// acts over [k+1, k+2).
#pragma once

#include <cmath>
#include <functional>
#include <random>
#include <vector>

#include "estimators/believed_machine.hpp"
#include "plant/machine.hpp"
#include "tests/estimators/machines.hpp"

namespace slipbench::tests {

// One estimator of any method, behind a function.
struct Rider {
  std::string_view name;
  std::function<Estimate<double>(const Sample<double>&)> step;
};
template <class Method>
Rider rider(const EstimatorSetup& setup, const Settings& given = {}) {
  const auto constants = Method::prepare(setup, given);
  return {Method::kind, [constants, state = Method::begin(setup, constants)](const Sample<double>& sample) mutable {
            return Method::step(state, sample, constants);
          }};
}

struct Truth {
  double time, speed, electrical_frequency, torque;  // s, mechanical rad/s, stator frequency Hz, N m
  Vec2<double> rotor_flux;
};

class DriveBench {
 public:
  std::function<double(double)> speed_reference = [](double) { return 0.0; };  // mechanical rad/s
  std::function<double(double)> load_torque = [](double) { return 0.0; };      // N m
  int speed_from = -1;         // -1: the true speed; else the rider that closes the loop
  double magnetising_s = 0.3;  // speed reference waits for the flux
  double noise_share = 0.01;   // of rated peak current, rms a phase
  double believed_R_r = 1.0;   // factor, for controller (riders have their own setup)
  double current_bandwidth = rad_per_turn * 200.0, speed_bandwidth = rad_per_turn * 5.0;

  DriveBench(const PublishedMachine& machine, unsigned seed)
      : machine_(machine), plant_(make_machine(machine.circuit)), random_(seed) {
    flux_reference_ = nominal_rotor_flux(setup_of(machine));
  }

  // Runs; `watch` sees truth and each rider's estimate at every control tick.
  void run(double duration, std::vector<Rider>& riders,
           const std::function<void(const Truth&, const std::vector<Estimate<double>>&)>& watch) {
    const InverseGamma<double> c = to_inverse_gamma(machine_.circuit);
    const double L = c.leakage, R_R = c.rotor_resistance * believed_R_r, alpha = R_R / c.magnetizing_inductance;
    const double k_t = 1.5 * c.pole_pairs, w_rated = machine_.plate.angular_frequency();
    const double most_torque = 1.8 * machine_.plate.torque_Nm, most_current = 5.0 * machine_.plate.peak_current_A();
    std::vector<Estimate<double>> estimates(riders.size());
    Vec2<double> applied{}, pending{}, integral{}, measured{};
    double angle = 0.0, speed_integral = 0.0, flux_ref = 0.0, held_speed = 0.0;
    const auto ticks = static_cast<std::int64_t>(std::lround(duration / T_));
    for (std::int64_t k = 0; k <= ticks; ++k) {
      const double t = static_cast<double>(k) * T_;
      measured = noisy(stator_current(plant_, psi_));
      Sample<double> sample;
      sample.tick = k;
      sample.u_alpha = applied.x;
      sample.u_beta = applied.y;
      sample.i_alpha = measured.x;
      sample.i_beta = measured.y;
      sample.speed = speed_;  // for those that are told it
      for (std::size_t n = 0; n < riders.size(); ++n) estimates[n] = riders[n].step(sample);
      watch(truth(t), estimates);

      // Speed and flux references to currents.
      held_speed = speed_from < 0 ? speed_ : estimates[static_cast<std::size_t>(speed_from)].speed;
      const double w_r = c.pole_pairs * held_speed;
      const double flux_goal = flux_reference_ * std::min(1.0, w_rated / std::max(std::fabs(w_r), 1.0));
      flux_ref += (flux_goal - flux_ref) * T_ / 0.01;
      const double i_d =
          std::min(flux_ref / c.magnetizing_inductance + (flux_goal - flux_ref) / (0.01 * R_R), most_current);
      const double goal = t < magnetising_s ? 0.0 : speed_reference(t - magnetising_s);
      const double kp = machine_.inertia * speed_bandwidth, error = goal - held_speed;
      const double wanted = kp * error + speed_integral;
      const double torque_ref = std::clamp(wanted, -most_torque, most_torque);
      if (t >= magnetising_s) speed_integral += T_ * kp * speed_bandwidth / 4.0 * (error - (wanted - torque_ref) / kp);
      const double flux_now = std::max(flux_ref, 0.1 * flux_reference_), i_q = torque_ref / (k_t * flux_now);
      const double w_s = w_r + R_R * i_q / flux_now;

      // Current control on the indirect flux angle.
      const auto turn = [](double a) { return SinCos<double>{std::sin(a), std::cos(a)}; };
      const Vec2<double> i = turn_back(turn(angle), measured), e = Vec2<double>{i_d, i_q} - i;
      integral = integral + (T_ * current_bandwidth * (c.stator_resistance + R_R)) * e;
      const Vec2<double> u = (current_bandwidth * L) * e + integral + (w_s * L) * quarter_turn(i) +
                             Vec2<double>{-alpha * flux_ref, w_r * flux_ref};
      applied = pending;
      pending = turn_forward(turn(angle + 1.5 * w_s * T_), u);
      angle += w_s * T_;
      angle -= rad_per_turn * std::floor(angle / rad_per_turn);
      advance(applied, t);
    }
  }

  [[nodiscard]] double flux_reference() const { return flux_reference_; }

 private:
  struct Full {
    MachineFlux<double> psi;
    double speed;
  };
  Full slope(const Full& x, const Vec2<double>& u, double load) const {
    const Vec2<double> i = stator_current(plant_, x.psi);
    return {flux_derivative(plant_, x.psi, i, u, plant_.pole_pairs * x.speed),
            (torque(plant_, x.psi, i) - load) / machine_.inertia};
  }
  static Full plus(const Full& a, double h, const Full& b) {
    return {{a.psi.stator + h * b.psi.stator, a.psi.rotor + h * b.psi.rotor}, a.speed + h * b.speed};
  }
  // Five classical Runge-Kutta steps of 20 us: their error is below 1e-9 of the state a period.
  void advance(const Vec2<double>& u, double t) {
    constexpr int steps = 5;
    const double h = T_ / steps, load = load_torque(t - magnetising_s);
    for (int n = 0; n < steps; ++n) {
      const Full x{psi_, speed_}, k1 = slope(x, u, load), k2 = slope(plus(x, h / 2, k1), u, load),
                                  k3 = slope(plus(x, h / 2, k2), u, load), k4 = slope(plus(x, h, k3), u, load);
      const Full next = plus(plus(plus(plus(x, h / 6, k1), h / 3, k2), h / 3, k3), h / 6, k4);
      psi_ = next.psi;
      speed_ = next.speed;
    }
  }
  Vec2<double> noisy(const Vec2<double>& i) {
    const double s = noise_share * machine_.plate.peak_current_A();
    Phases<double> phase = phases_of(i);
    phase.a += s * normal_(random_);
    phase.b += s * normal_(random_);
    phase.c += s * normal_(random_);
    return clarke(phase);
  }
  [[nodiscard]] Truth truth(double t) const {
    const Vec2<double> i = stator_current(plant_, psi_), zero{};
    const MachineFlux<double> slope_now = flux_derivative(plant_, psi_, i, zero, plant_.pole_pairs * speed_);
    const double size2 = dot(psi_.rotor, psi_.rotor);
    const double w_s = size2 > 1e-9 ? cross(psi_.rotor, slope_now.rotor) / size2 : 0.0;
    return {t - magnetising_s, speed_, w_s / rad_per_turn, torque(plant_, psi_, i), psi_.rotor};
  }

  static constexpr double T_ = 100e-6;
  PublishedMachine machine_;
  Machine<double> plant_;
  std::mt19937_64 random_;
  std::normal_distribution<double> normal_;
  MachineFlux<double> psi_{};
  double speed_ = 0.0, flux_reference_ = 0.0;
};

// Speed error over a window, in shares of a given speed.
struct SpeedScore {
  double from, to, scale;
  double sum = 0.0, sum2 = 0.0, most = 0.0, frequency = 0.0;
  long count = 0;
  void see(const Truth& truth, const Estimate<double>& estimate) {
    if (truth.time < from || truth.time >= to) return;
    const double e = (estimate.speed - truth.speed) / scale;
    sum += e;
    sum2 += e * e;
    most = std::isfinite(e) ? std::max(most, std::fabs(e)) : HUGE_VAL;
    frequency += truth.electrical_frequency;
    ++count;
  }
  [[nodiscard]] double bias() const { return sum / static_cast<double>(count); }
  [[nodiscard]] double rms() const { return std::sqrt(sum2 / static_cast<double>(count)); }
  [[nodiscard]] double mean_frequency() const { return frequency / static_cast<double>(count); }
};

}  // namespace slipbench::tests
