// Starting and recovering: from nothing, at standstill, woken up on a running machine, on mains-like
// transients, and on input that makes no sense.
#include <catch2/catch.hpp>
#include <limits>

#include "estimators/methods.hpp"
#include "tests/estimators/drive_bench.hpp"

using namespace slipbench;
using namespace slipbench::tests;

namespace {

bool sane(const Estimate<double>& e) {
  bool finite = true;
  each_number(e, [&](const double& x) { finite = finite && std::isfinite(x); });
  return finite && e.trust >= 0.0 && e.trust <= 1.0 && e.rotor_flux >= 0.0 &&
         e.rotor_flux_angle >= -3.14159265358979324 && e.rotor_flux_angle < 3.14159265358979324;
}

template <class F>
void each_rider(const EstimatorSetup& setup, F&& f) {
  each_estimator_method([&]<class Method>() {
    Rider r = rider<Method>(setup);
    INFO(r.name);
    f(r);
  });
}

}  // namespace

TEST_CASE("estimators: start on a dead machine, stay at rest, and say so", "[estimators][start]") {
  each_rider(setup_of(krause_3hp()), [](Rider& r) {
    Estimate<double> e;
    for (int k = 0; k < 2000; ++k) {
      Sample<double> s;
      s.tick = k;
      e = r.step(s);
      REQUIRE(sane(e));
    }
    CHECK(e.speed == 0.0);
    CHECK(e.rotor_flux == 0.0);
    CHECK(e.torque == 0.0);
    CHECK(e.trust == 0.0);
  });
}

TEST_CASE("estimators: magnetising with direct current leaves speed at zero", "[estimators][start]") {
  for (const PublishedMachine& machine : published_machines()) {
    std::vector<Rider> riders;
    each_estimator_method([&]<class Method>() { riders.push_back(rider<Method>(setup_of(machine))); });
    DriveBench bench(machine, 11);
    std::vector<double> most(riders.size(), 0.0), flux(riders.size(), 0.0);
    double true_flux = 0.0;
    bench.run(2.0, riders, [&](const Truth& truth, const std::vector<Estimate<double>>& estimates) {
      true_flux = magnitude(truth.rotor_flux);
      for (std::size_t n = 0; n < riders.size(); ++n) {
        most[n] = std::max(most[n], std::fabs(estimates[n].speed - truth.speed));
        flux[n] = estimates[n].rotor_flux;
      }
    });
    for (std::size_t n = 0; n < riders.size(); ++n) {
      INFO(machine.name << ", " << riders[n].name);
      // While there is hardly any flux its direction is noise: a few per cent of rated speed for some ms.
      CHECK(most[n] < 0.03 * machine.plate.speed_rad_s());
      CHECK(flux[n] == Approx(true_flux).epsilon(0.02));  // 1 % of current noise and a margin of two
    }
  }
}

TEST_CASE("estimators: begun magnetised and turning, they begin right", "[estimators][start]") {
  EstimatorSetup setup = setup_of(barut_3kW());
  setup.start_rotor_flux_Wb = 0.8;
  setup.start_speed_rad_s = 100.0;
  const BelievedMachine<double> m = believe(setup);
  each_rider(setup, [&](Rider& r) {
    Sample<double> s;
    s.i_alpha = 0.8 / m.per_flux_ratio * m.alpha / m.R_R;  // the current that holds this flux
    s.speed = 100.0;                                       // for those that are told it
    const Estimate<double> e = r.step(s);
    CHECK(e.speed == Approx(100.0).epsilon(1e-6));
    CHECK(e.rotor_flux == Approx(0.8).epsilon(1e-3));  // the filter weighs the first current against its guess of none
    CHECK(std::fabs(e.rotor_flux_angle) < 1e-6);
  });
}

TEST_CASE("estimators: woken up on a running machine they find it", "[estimators][recovery]") {
  const PublishedMachine machine = barut_3kW();
  const double rated = machine.plate.speed_rad_s();
  for (const double share : {0.1, 1.0, -1.0}) {
    std::vector<Rider> inner, one{{"none", [](const Sample<double>&) { return Estimate<double>{}; }}};
    each_estimator_method([&]<class Method>() { inner.push_back(rider<Method>(setup_of(machine))); });
    std::vector<Estimate<double>> estimates(inner.size());
    std::vector<double> settled(inner.size(), 0.0);
    constexpr std::int64_t wake = 15000;
    one[0].step = [&](const Sample<double>& s) {
      for (std::size_t n = 0; n < inner.size() && s.tick >= wake; ++n) estimates[n] = inner[n].step(s);
      return Estimate<double>{};
    };
    DriveBench bench(machine, 3);
    bench.speed_reference = [&](double t) { return share * rated * std::min(1.0, 2.0 * t); };
    bench.load_torque = [&](double t) { return t > 0.7 ? std::copysign(0.5 * machine.plate.torque_Nm, share) : 0.0; };
    const double awake = wake * 1e-4 - bench.magnetising_s;
    bench.run(3.0, one, [&](const Truth& truth, const std::vector<Estimate<double>>&) {
      for (std::size_t n = 0; n < inner.size() && truth.time >= awake; ++n) {
        if (!(std::fabs(estimates[n].speed - truth.speed) < 0.03 * rated)) settled[n] = truth.time - awake;
      }
    });
    for (std::size_t n = 0; n < inner.size(); ++n) {
      INFO(inner[n].name << " at " << share << " of rated speed");
      CHECK(settled[n] < 0.3);  // three rotor time constants of 0.108 s: the flux error's own pace at low frequency
    }
  }
}

// Believing anything at all - flux none, half or full along the wrong axis, speed rated either way - about a
// machine that runs.
TEST_CASE("estimators: begun with a wrong belief they come right", "[estimators][recovery]") {
  const PublishedMachine machine = krause_3hp();
  const double rated = machine.plate.speed_rad_s(), flux = nominal_rotor_flux(setup_of(machine));
  for (const double share : {0.1, 0.6, -0.6}) {
    std::vector<Rider> inner, one{{"none", {}}};
    for (const double part : {0.0, 0.5, 1.0}) {
      for (const double turn : {-1.0, 0.0, 1.0}) {
        EstimatorSetup wrong = setup_of(machine);
        wrong.start_rotor_flux_Wb = part * flux;
        wrong.start_speed_rad_s = turn * rated;
        each_estimator_method([&]<class Method>() { inner.push_back(rider<Method>(wrong)); });
      }
    }
    std::vector<Estimate<double>> estimates(inner.size());
    one[0].step = [&](const Sample<double>& s) {
      for (std::size_t n = 0; n < inner.size() && s.tick >= 12000; ++n) estimates[n] = inner[n].step(s);
      return Estimate<double>{};
    };
    DriveBench bench(machine, 3);
    bench.speed_reference = [&](double t) { return share * rated * std::min(1.0, 2.0 * t); };
    bench.load_torque = [&](double t) { return t > 0.5 ? 0.5 * machine.plate.torque_Nm : 0.0; };
    double true_speed = 0.0;
    bench.run(2.4, one, [&](const Truth& truth, const std::vector<Estimate<double>>&) { true_speed = truth.speed; });
    for (std::size_t n = 0; n < inner.size(); ++n) {
      INFO(inner[n].name << " at " << share << ", belief " << n / 3);
      // 1.2 s later, some fourteen rotor time constants.
      CHECK(std::fabs(estimates[n].speed - true_speed) < 0.02 * rated);
    }
  }
}

TEST_CASE("estimators: any finite input gives finite, bounded answers, and they recover", "[estimators][recovery]") {
  const PublishedMachine machine = hinkkanen_2kW();
  const EstimatorSetup setup = setup_of(machine);
  std::mt19937_64 random(9);
  std::normal_distribution<double> normal;
  each_rider(setup, [&](Rider& r) {
    for (int k = 0; k < 20000; ++k) {
      Sample<double> s;
      s.tick = k;
      const double wild = k % 3000 < 1000 ? 1e3 : 1.0;  // currents up to kA, voltages up to MV
      s.u_alpha = 300.0 * wild * normal(random);
      s.u_beta = 300.0 * wild * normal(random);
      s.i_alpha = 7.0 * wild * normal(random);
      s.i_beta = 7.0 * wild * normal(random);
      const Estimate<double> e = r.step(s);
      REQUIRE(sane(e));
      // Held inside three times rated, synchronous.
      REQUIRE(std::fabs(e.speed) <=
              3.0 * machine.plate.angular_frequency() / machine.circuit.pole_pairs * (1.0 + 1e-12));
    }
  });
}

TEST_CASE("estimators: not-a-number in shows as not-a-number out", "[estimators][recovery]") {
  each_rider(setup_of(krause_3hp()), [](Rider& r) {
    Sample<double> s;
    r.step(s);
    s.i_alpha = std::numeric_limits<double>::quiet_NaN();
    for (int k = 0; k < 3; ++k) {
      const Estimate<double> e = r.step(s);
      CHECK(std::isnan(e.rotor_flux));  // never hidden behind a clamp
    }
  });
}
