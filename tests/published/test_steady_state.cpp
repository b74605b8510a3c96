// The simulated machine at rest with itself against the equivalent circuit, from a start at zero flux: nothing of the
// product's own steady-state code takes part in the run.
#include <catch2/catch.hpp>

#include "plant/steady_state.hpp"
#include "tests/published/machines.hpp"
#include "tests/published/rows.hpp"

using namespace slipbench;
using namespace slipbench::published;

namespace {

// The circuit's figures are printed to 10-11 digits; rk4 at 10 us leaves (w h)^4/120 < 1e-12 a step, and the slowest pole of
// these machines (-14 1/s) has decayed below 1e-12 after 2.5 s. 1e-8 is the bound asked for.
constexpr double bound = 1e-8;

}  // namespace

TEST_CASE("steady torque and current: equal the circuit's at an imposed slip", "[published][plant]") {
  for (const Published& p : four()) {
    Scenario s = on_mains(p, 2.5, 10e-6);
    const double speed = (1.0 - p.slip) * p.frequency * 60.0 / p.circuit.pole_pairs;
    LoadSettings dynamometer;
    dynamometer.kind = "imposed_speed";
    dynamometer.speed_rpm = {{0.0, speed}};
    s.loads.push_back(dynamometer);
    const PlantRow end = rows_of(s).rows.back();
    const double current = std::hypot(end[P::i_alpha], end[P::i_beta]) / std::sqrt(2.0);
    INFO(p.name << ": torque " << end[P::torque] << " error " << end[P::torque] / p.torque - 1.0 << ", current error "
                << current / p.current_rms - 1.0);
    CHECK(std::fabs(end[P::torque] / p.torque - 1.0) < bound);
    CHECK(std::fabs(current / p.current_rms - 1.0) < bound);
    CHECK(std::fabs(end[P::stator_frequency] / p.frequency - 1.0) < bound);
    WARN(p.name << ": torque " << end[P::torque] / p.torque - 1.0 << ", current " << current / p.current_rms - 1.0);
  }
}

TEST_CASE("steady speed: equals the circuit's under a load torque", "[published][plant]") {
  for (const Published& p : four()) {
    Scenario s = on_mains(p, 4.0, 10e-6);
    LoadSettings load;
    load.kind = "profile";
    load.torque_profile = {{0.0, 0.0}, {1.0, 0.0}, {1.0, p.torque}};
    s.loads.push_back(load);
    const PlantRow end = rows_of(s).rows.back();
    const double speed = (1.0 - p.slip) * p.frequency * 60.0 / p.circuit.pole_pairs;
    CHECK(std::fabs(end[P::speed_rpm] / speed - 1.0) < bound);
    WARN(p.name << ": speed " << end[P::speed_rpm] / speed - 1.0);
  }
}

TEST_CASE("steady start: begins in the circuit's equilibrium and stays there", "[published][plant]") {
  for (const Published& p : four()) {
    Scenario s = on_mains(p, 0.5, 10e-6);
    s.run.start = "steady";
    LoadSettings load;
    load.kind = "profile";
    load.torque_profile = {{0.0, p.torque}};
    s.loads.push_back(load);
    const double speed = (1.0 - p.slip) * p.frequency * 60.0 / p.circuit.pole_pairs;
    for (const PlantRow& row : rows_of(s).rows) {
      CHECK(std::fabs(row[P::speed_rpm] / speed - 1.0) < bound);
      CHECK(std::fabs(row[P::torque] / p.torque - 1.0) < bound);
    }
  }
}

TEST_CASE("pull-out: slip and torques equal the circuit's", "[published][plant]") {
  // Krause 3 hp: s_k 0.5267994194, T_k 61.86961835 motor, -106.53565662 generator, computed from the circuit by SciPy.
  const Published p = krause_3hp();
  const double w = 2.0 * 3.14159265358979323846 * 60.0, peak = p.line_voltage * std::sqrt(2.0 / 3.0);
  const double s_k = pull_out_slip(p.circuit, w);
  CHECK(s_k == Approx(0.5267994194).epsilon(1e-9));  // digits printed
  CHECK(steady_at_slip(p.circuit, peak, w, s_k).torque == Approx(61.86961835).epsilon(1e-9));
  CHECK(steady_at_slip(p.circuit, peak, w, -s_k).torque == Approx(-106.53565662).epsilon(1e-9));
  CHECK_FALSE(stable_slip(p.circuit, peak, w, [](double) { return 62.0; }));
  CHECK(stable_slip(p.circuit, peak, w, [](double) { return 61.8; }));
}

TEST_CASE("inverse-gamma circuit: the published equivalents", "[published][plant]") {
  // Krause 3 hp: L_sigma 0.003944000072 H, L_M 0.06736802476 H, R_R 0.7708701069 ohm, alpha 11.44267 1/s, computed from the
  // circuit; form after G.R. Slemon, 1989. Tolerances: digits printed.
  const InverseGamma<double> g = to_inverse_gamma(krause_3hp().circuit);
  CHECK(g.leakage == Approx(0.003944000072).epsilon(1e-9));
  CHECK(g.magnetizing_inductance == Approx(0.06736802476).epsilon(1e-9));
  CHECK(g.rotor_resistance == Approx(0.7708701069).epsilon(1e-9));
  CHECK(g.rotor_resistance / g.magnetizing_inductance == Approx(11.44267).epsilon(1e-6));
  // The same machine as a T and as an inverse-gamma circuit draws the same current and gives the same torque at any slip.
  const Circuit<double> t = krause_3hp().circuit,
                        same = from_inverse_gamma(2.0, g.stator_resistance, g.rotor_resistance, g.leakage,
                                                  g.magnetizing_inductance);
  const double L_s = t.stator_inductance(),
               r = L_s / t.magnetizing_inductance;  // gamma form: all leakage on the rotor side
  const double L_leak = r * r * t.rotor_inductance() - L_s;
  const Circuit<double> gamma = from_gamma(2.0, t.stator_resistance, r * r * t.rotor_resistance, L_leak, L_s);
  for (const double slip : {-0.3, -0.02, 0.01, 0.05, 1.0}) {
    const SteadyState a = steady_at_slip(t, 100.0, 377.0, slip);
    for (const Circuit<double>& other : {same, gamma}) {
      const SteadyState b = steady_at_slip(other, 100.0, 377.0, slip);
      CHECK(b.torque == Approx(a.torque).epsilon(1e-12));  // rounding
      CHECK(b.current.x == Approx(a.current.x).epsilon(1e-12));
      CHECK(b.current.y == Approx(a.current.y).epsilon(1e-12));
    }
  }
}
