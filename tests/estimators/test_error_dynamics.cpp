// Stability of the observers' linearised error dynamics, as discretised, and a published boundary of
// instability that the same linearisation must find when the gain is taken away.
#include <catch2/catch.hpp>
#include <random>

#include "estimators/methods.hpp"
#include "sim/linear/error_dynamics.hpp"
#include "tests/estimators/machines.hpp"

using namespace slipbench;
using namespace slipbench::tests;

namespace {

struct Map {
  int points = 0, unstable = 0;
  double slowest = -1e300, speed_error = 0.0, miss = 0.0;
  void add(const ErrorDynamics& e) {
    ++points;
    if (!e.stable()) ++unstable;
    slowest = std::max(slowest, e.slowest_per_s);
    speed_error = std::max(speed_error, std::fabs(e.speed_error_rad_s));
    miss = std::max(miss, e.miss);
  }
};

// At this flux psi_R (inverse-gamma), torque and electrical speed.
template <class Method>
ErrorDynamics at(const EstimatorSetup& setup, const typename Method::template Constants<double>& c, double flux,
                 double torque, double w_r) {
  const double psi_r = flux / to_inverse_gamma(setup.circuit).flux_ratio;
  const TurningPoint p = turning_point(setup.circuit, setup.control_period_s, psi_r, torque, w_r);
  return error_dynamics<Method>(c, Method::begin(setup, c), p, 0);
}

// |speed| to 150 % and |torque| to 150 % of rated, flux weakened above rated speed, |stator frequency| >= 0.5
// Hz; and the line of 0.5 Hz itself, both ways round, at full flux.
template <class Method>
Map stability_map(const PublishedMachine& machine) {
  const EstimatorSetup setup = setup_of(machine);
  const auto c = Method::prepare(setup, {});
  const BelievedMachine<double>& m = c.machine;
  const double flux = nominal_rotor_flux(setup), rated = machine.plate.speed_rad_s() * m.pole_pairs,
               least = rad_per_turn * 0.5;
  const auto slip = [&](double torque, double psi) { return m.R_R * torque / (m.torque_factor * psi * psi); };
  Map map;
  for (int speed = -150; speed <= 150; speed += 5) {
    for (int torque = -150; torque <= 150; torque += 10) {
      const double weakened = flux * std::min(1.0, 100.0 / std::max(1.0, std::fabs(double(speed))));
      const double T = 0.01 * torque * machine.plate.torque_Nm, w_r = 0.01 * speed * rated;
      if (std::fabs(w_r + slip(T, weakened)) >= least) map.add(at<Method>(setup, c, weakened, T, w_r));
    }
  }
  for (double w_s : {-least, least}) {
    for (int torque = -150; torque <= 150; torque += 10) {
      const double T = 0.01 * torque * machine.plate.torque_Nm;
      map.add(at<Method>(setup, c, flux, T, w_s - slip(T, flux)));
    }
  }
  return map;
}

// Zero gain and integral adaptation dw_r/dt = -k_i Im(conj(psi) eps), as the published analysis has it.
Luenberger::Constants<double> zero_gain(const EstimatorSetup& setup, double flux, double k_i) {
  auto c = Luenberger::prepare(setup, {});
  c.current_share = c.flux_share = 0.0;
  c.adaptation = setup.control_period_s * k_i * flux * flux;  // step divides eps_q by the flux once
  return c;
}
double slowest_at_zero_gain(const PublishedMachine& machine, double w_s, double w_r) {
  constexpr double flux = 0.9, k_i = 2000.0;
  EstimatorSetup setup = setup_of(machine);
  setup.control_period_s = 1e-5;  // near continuous time, where the published values live
  const auto c = zero_gain(setup, flux, k_i);
  const double torque = c.machine.torque_factor * flux * flux * (w_s - w_r) / c.machine.R_R;
  return at<Luenberger>(setup, c, flux, torque, w_r).slowest_per_s;
}

// Electrical speed at which the slowest pole crosses the axis, between these.
double crossing(const PublishedMachine& machine, double w_s, double stable, double unstable) {
  for (int round = 0; round < 40; ++round) {
    const double middle = 0.5 * (stable + unstable);
    (slowest_at_zero_gain(machine, w_s, middle) < 0.0 ? stable : unstable) = middle;
  }
  return 0.5 * (stable + unstable);
}

}  // namespace

TEST_CASE("luenberger: error dynamics are stable wherever the stator frequency is 0.5 Hz or more",
          "[estimators][stability]") {
  for (const PublishedMachine& machine : published_machines()) {
    const Map map = stability_map<Luenberger>(machine);
    INFO(machine.name << ": " << map.points << " points, slowest " << map.slowest << " 1/s");
    CHECK(map.points > 1800);
    CHECK(map.unstable == 0);
    CHECK(map.slowest < -1.0);  // measured -2.1 to -3.6: a stable pole that takes seconds would be of no use
    CHECK(map.miss < 1e-9);     // the state really is a fixed point
  }
}

TEST_CASE("reduced_order: error dynamics are stable wherever the stator frequency is 0.5 Hz or more",
          "[estimators][stability]") {
  for (const PublishedMachine& machine : published_machines()) {
    const Map map = stability_map<ReducedOrder>(machine);
    INFO(machine.name << ": " << map.points << " points, slowest " << map.slowest << " 1/s");
    CHECK(map.points > 1800);
    CHECK(map.unstable == 0);
    CHECK(map.slowest < -1.0);
    CHECK(map.miss < 1e-9);
    // Trapezoid over the period: (w T)^2 / 12 of the resistive and leakage terms, 3e-4 of 10 % of 565 rad/s.
    CHECK(map.speed_error < 0.03);
  }
}

// Published: region of instability of the speed-adaptive full-order observer at zero gain; the boundary is
// w_s (-T_s / T_r) in slip. H. Kubota et al., IEEE Trans. Ind. Appl. 38(4), 2002, 1081-1086; M. Hinkkanen, J.
// Luomi, IEEE Trans. Ind. Electron. 51(6), 2004, 1318-1328. Values for psi = 0.9 Wb, k_i = 2000: computed
// independently from the continuous equations.
TEST_CASE("luenberger: zero gain shows the published generating instability", "[estimators][published]") {
  const PublishedMachine machine = hinkkanen_2kW();
  struct Row {
    double w_s, boundary, inside, outside;
  };
  for (const Row& row : {Row{5.0, 7.425919618528612, -0.0581, 0.0565}, Row{20.0, 29.703678474, -0.7996, 0.6185}}) {
    // Printed to 4 digits; a period of 10 us shifts a root s by s^2 T / 2, below 1e-3 of it here.
    CHECK(slowest_at_zero_gain(machine, row.w_s, 0.99 * row.boundary) == Approx(row.inside).epsilon(0.01));
    CHECK(slowest_at_zero_gain(machine, row.w_s, 1.01 * row.boundary) == Approx(row.outside).epsilon(0.01));
  }
  // T_r / T_s is the boundary w_s / (-slip): values as listed, 8 digits. Asked for within 1 % of speed; what is left is the period's
  // s^2 T / 2 of a pole that crosses near j w_s, 1e-3 at most.
  struct Ratio {
    PublishedMachine machine;
    double ratio;
  };
  const PublishedMachine hp50 = ::machine("Krause 50 hp", published::krause_50hp_circuit(),
                                          {37300, 460, 46.8, 60, 1705, 198}),
                         hp500 = ::machine("Krause 500 hp", published::krause_500hp_circuit(),
                                           {373000, 2300, 93.6, 60, 1773, 1980});
  for (const Ratio& row : {Ratio{krause_3hp(), 0.53308824}, Ratio{hp50, 0.38157895}, Ratio{hp500, 1.40106952},
                           Ratio{hinkkanen_2kW(), 2.06107406}}) {
    const Circuit<double>& c = row.machine.circuit;
    CHECK((c.rotor_inductance() / c.rotor_resistance) / (c.stator_inductance() / c.stator_resistance) ==
          Approx(row.ratio).epsilon(1e-7));
    const double w_s = 5.0, boundary = w_s + w_s / row.ratio;
    const double found = crossing(row.machine, w_s, 0.9 * boundary, 1.1 * boundary);
    INFO(row.machine.name << ": found " << found << ", published " << boundary << " rad/s");
    CHECK(found == Approx(boundary).epsilon(0.001));
  }
}

// Every number of a state that turns is turned: a step seen from a turned frame is the step turned, for any state and any angle. What a
// frame hides would make every pole of these maps wrong.
TEST_CASE("estimators: a step is the same in every frame", "[estimators][stability]") {
  std::mt19937_64 random(3);
  std::uniform_real_distribution<double> any(-1.0, 1.0);
  EstimatorSetup setup = setup_of(barut_3kW());
  each_estimator_method([&]<class Method>() {
    const auto c = Method::prepare(setup, {});
    for (int draw = 0; draw < 20; ++draw) {
      const double angle = 0.4 * any(random);
      auto s = Method::begin(setup, c);
      const TurningPoint p =
          turning_point(setup.circuit, setup.control_period_s, 0.9, 5.0 * any(random), 200.0 * any(random));
      tell_truth("", s, p);
      each_number(s, [&](double& x) { x *= 1.0 + 0.01 * any(random); });
      if constexpr (requires { s.P; }) {  // a covariance stays symmetric
        for (std::size_t r = 0; r < 6; ++r) {
          for (std::size_t n = r; n < 6; ++n) s.P.set(r, n, s.P(r, n) + (r == n ? 0.0 : 1e-6 * any(random)));
        }
      }
      const auto sample_of = [&](double by) {
        const SinCos<double> at = sincos(p.w_s * p.period_s + by);
        const Vec2<double> i = turn_forward(at, p.current), u = turn_forward(at, p.voltage);
        Sample<double> sample;
        sample.i_alpha = i.x, sample.i_beta = i.y, sample.u_alpha = u.x, sample.u_beta = u.y;
        return sample;
      };
      auto straight = s, turned = turned_state<double>(s, angle);
      Method::step(straight, sample_of(0.0), c);
      Method::step(turned, sample_of(angle), c);
      straight = turned_state<double>(straight, angle);
      const auto a = numbers_of<double>(straight), b = numbers_of<double>(turned);
      INFO(Method::kind);
      for (std::size_t n = 0; n < a.size(); ++n) CHECK(*a[n] == Approx(*b[n]).epsilon(1e-9).margin(1e-9));
    }
  });
}
