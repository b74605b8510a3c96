// Every method of the list keeps the contract: settings, defaults, what an estimate fills in.
#include <catch2/catch.hpp>
#include <cctype>
#include <complex>
#include <set>
#include <string>

#include "estimators/methods.hpp"
#include "tests/estimators/machines.hpp"

using namespace slipbench;
using namespace slipbench::tests;

TEST_CASE("methods: kinds and settings are well formed", "[estimators][contract]") {
  std::set<std::string_view> kinds;
  each_estimator_method([&]<class Method>() {
    INFO(Method::kind);
    CHECK(kinds.insert(Method::kind).second);
    std::set<std::string_view> names;
    for (const Setting& s : Method::settings) {
      INFO(s.name);
      CHECK(names.insert(s.name).second);
      CHECK(s.low <= s.high);
      if (!std::isnan(s.fallback)) CHECK((s.low <= s.fallback && s.fallback <= s.high));
      REQUIRE(!s.meaning.empty());
      CHECK(s.meaning.back() == '.');
      for (const char letter : s.name) CHECK((std::isalnum(static_cast<unsigned char>(letter)) != 0 || letter == '_'));
      // The key ends in its unit, written without signs: "N m" as Nm, "rad/s" as rad_s.
      std::string unit;
      for (const char letter : s.unit) {
        if (letter == '/')
          unit += '_';
        else if (letter != ' ')
          unit += letter;
      }
      CHECK(s.name.ends_with(unit));
    }
  });
  CHECK(kinds == std::set<std::string_view>{"luenberger", "reduced_order", "extended_kalman",
                                            "linear_observer"});  // kinds the scenario contract names
}

TEST_CASE("methods: constants are finite at every corner of every setting's range that a drive would use",
          "[estimators][contract]") {
  const EstimatorSetup setup = setup_of(krause_3hp());
  each_estimator_method([&]<class Method>() {
    for (const Setting& s : Method::settings) {
      for (const double value : {s.low, s.high}) {
        Settings given;
        given.set(std::string(s.name), value);
        const auto c = Method::prepare(setup, given);
        INFO(Method::kind << " " << s.name << " = " << value);
        each_number(c, [](const double& x) { CHECK(std::isfinite(x)); });
      }
    }
  });
}

TEST_CASE("methods: covariance is filled by the filter alone", "[estimators][contract]") {
  EstimatorSetup setup = setup_of(krause_3hp());
  setup.start_rotor_flux_Wb = 0.4;
  each_estimator_method([&]<class Method>() {
    const auto c = Method::prepare(setup, {});
    auto state = Method::begin(setup, c);
    Sample<double> sample;
    sample.i_alpha = 6.0;
    const Estimate<double> e = Method::step(state, sample, c);
    INFO(Method::kind);
    CHECK(e.size == sizeof(Estimate<double>));
    CHECK(e.version == SLIPBENCH_ESTIMATOR_ABI_VERSION);
    const bool filter = Method::kind == "extended_kalman";
    CHECK(e.has_covariance == (filter ? 1.0 : 0.0));
    if (filter) {
      CHECK(e.covariance[0] > 0.0);
      CHECK(e.covariance[3] > 0.0);
      CHECK(e.covariance[5] > 0.0);
      CHECK(e.covariance[0] * e.covariance[3] > e.covariance[1] * e.covariance[1]);
    }
  });
}

// Flux of the T circuit at rated voltage, frequency and speed, by the textbook phasor circuit solved with
// complex numbers.
TEST_CASE("methods: nominal flux is the circuit's", "[estimators][closed_form]") {
  using C = std::complex<double>;
  for (const PublishedMachine& machine : published_machines()) {
    const EstimatorSetup setup = setup_of(machine);
    const Circuit<double>& c = machine.circuit;
    const double w = machine.plate.angular_frequency(), slip = 1.0 - c.pole_pairs * machine.plate.speed_rad_s() / w;
    const C j(0.0, 1.0), z_m = j * w * c.magnetizing_inductance,
                         z_r = c.rotor_resistance / slip + j * w * c.rotor_leakage;
    const C i_s =
        machine.plate.phase_peak_V() / (c.stator_resistance + j * w * c.stator_leakage + z_m * z_r / (z_m + z_r));
    const C i_r = -i_s * z_m / (z_m + z_r), psi_r = c.magnetizing_inductance * i_s + c.rotor_inductance() * i_r;
    CHECK(nominal_rotor_flux(setup) * believe(setup).per_flux_ratio ==
          Approx(std::abs(psi_r)).epsilon(1e-12));  // rounding
  }
}
