// A scenario's operating point against the plant's own equations and the circuit; the linear system there against a run of the scenario.
#include <Eigen/Dense>
#include <Eigen/Eigenvalues>
#include <catch2/catch.hpp>

#include "plant/linear/linearise.hpp"
#include "sim/engine/simulate.hpp"
#include "sim/linear/operating_point.hpp"
#include "sim/scenario/input_error.hpp"
#include "sim/scenario/read.hpp"

using namespace slipbench;

namespace {

std::string config(const std::string& name) { return SLIPBENCH_SOURCE_DIR "/configs/" + name; }
Scenario demo(const std::string& name, const std::vector<Override>& overrides = {}) {
  return read_scenario(config("scenarios/" + name), overrides);
}

struct LastRow : RunObserver {
  std::vector<PlantRow> rows;
  void trace_row(const RowView& view) override { rows.push_back(*view.plant); }
};

std::vector<PlantRow> rows_of(const Scenario& s) {
  LastRow last;
  const std::array<RunObserver*, 1> observers{&last};
  REQUIRE_FALSE(simulate(s, observers).diverged);
  return last.rows;
}

// What the machine's equations leave at the point: zero in a steady state.
double unrest(const OperatingPoint& at) {
  const auto rate = linear::current_flux_rate(make_machine(at.machine.circuit), at.machine.frame_frequency,
                                              at.machine.current, at.machine.rotor_flux, at.steady.voltage,
                                              at.machine.circuit.pole_pairs * at.machine.speed_rad_s);
  const double shaft = at.speed_held ? 0.0 : (rate.torque - at.load_torque_Nm) / at.machine.inertia_kgm2;
  return std::max({magnitude(rate.current), magnitude(rate.flux), std::fabs(shaft)});
}

}  // namespace

TEST_CASE("operating point: a steady state, of every demo scenario", "[sim][linear]") {
  for (const char* name :
       {"mains_start.toml", "mill_mains_start.toml", "hoist_lowering.toml", "fan_field_weakening.toml",
        "winder_torque.toml", "loaded_reversal.toml", "wrong_nameplate.toml", "pump_two_phase.toml"}) {
    const Scenario s = demo(name);
    const OperatingPoint at = operating_point(s);
    INFO(name);
    // Rates of up to 1e6 A/s cancel: 1e-15 of that, some terms.
    CHECK(unrest(at) < 1e-7);
    CHECK(at.row[P::torque] == Approx(at.load_torque_Nm).margin(1e-9));
    CHECK(at.row[P::i_d] == Approx(at.machine.current.x).epsilon(1e-9));
    CHECK(at.row[P::i_q] == Approx(at.machine.current.y).epsilon(1e-9).margin(1e-9));
    CHECK(at.row[P::rotor_flux] == Approx(at.machine.rotor_flux.x));
    CHECK(at.row[P::stator_frequency] == Approx(at.machine.frame_frequency / 6.283185307179586).margin(1e-12));
    const linear::System system = linear::checked(system_at(at));
    CHECK(system.order() == (at.speed_held ? 4 : 5));
    CHECK(system.outputs() == (at.speed_held || !at.speed_measured ? 2 : 3));
  }
}

TEST_CASE("operating point: on mains, where a run from standstill ends", "[sim][linear]") {
  // The run's voltage has its phase too: u, i and flux agree as vectors. Settled to e^{-16 1/s x 2 s}, stepped at 20 us with rk4: 1e-6.
  Scenario s = demo("mains_start.toml", {{"run.duration_s", "2.0"}});
  const auto rows = rows_of(s);
  const PlantRow& end = rows.back();  // t = 2 s: 120 whole turns of 60 Hz
  const OperatingPoint at = operating_point(s);
  for (const P column : {P::speed_rpm, P::torque, P::load_torque, P::stator_frequency, P::u_alpha, P::u_beta,
                         P::i_alpha, P::i_beta, P::i_d, P::i_q, P::rotor_flux, P::rotor_flux_angle}) {
    INFO("column " << static_cast<int>(column));
    CHECK(at.row[column] == Approx(end[column]).epsilon(1e-5).margin(1e-6));
  }
}

TEST_CASE("operating point: in field weakening, the flux that the controller settles at", "[sim][linear]") {
  const std::vector<Override> steady = {{"reference.speed_rpm", "[[0.0, 2200.0]]"},
                                        {"run.start", "steady"},
                                        {"run.duration_s", "0.1"},
                                        {"score.from_s", "0.0"},
                                        {"belief.magnetizing_inductance", "1.0"},
                                        {"supply.dead_time_s", "0.0"},
                                        {"supply.device_drop_V", "0.0"}};
  const Scenario s = demo("fan_field_weakening.toml", steady);
  double flux = 0.0, torque = 0.0;
  const auto rows = rows_of(s);
  for (const PlantRow& row : rows) {
    flux += row[P::rotor_flux] / static_cast<double>(rows.size());
    torque += row[P::torque] / static_cast<double>(rows.size());
  }
  const OperatingPoint at = operating_point(s);
  // Noise, an encoder and converters at work: means over 0.1 s to a few tenths of a percent.
  CHECK(at.row[P::rotor_flux] == Approx(flux).epsilon(0.005));
  CHECK(at.row[P::torque] == Approx(torque).epsilon(0.01));
  CHECK(at.row[P::rotor_flux] < 0.8 * s.reference.rotor_flux_Wb);
}

TEST_CASE("system: predicts how the drive answers a small load step on mains", "[sim][linear]") {
  // 0.5 % of rated torque: the linear answer is right to the step's own size, 1 % with room.
  const double step_Nm = 0.07;
  const std::vector<Override> steady = {{"run.start", "steady"}, {"run.duration_s", "0.2"}};
  Scenario s = demo("mains_start.toml", steady);
  const auto before = rows_of(s);
  s.loads.push_back({"profile", {{0.0, 0.0}, {1e-9, step_Nm}}, 0, 0, 0, {}});
  const auto after = rows_of(s);
  const OperatingPoint at = operating_point(demo("mains_start.toml", steady));
  const linear::System system = system_at(at);
  REQUIRE(system.order() == 5);
  // x(t) = V (e^{Dt} - 1) D^{-1} V^{-1} B step
  const Eigen::EigenSolver<linear::Matrix> modes(system.A);
  const Eigen::MatrixXcd V = modes.eigenvectors();
  const Eigen::VectorXcd D = modes.eigenvalues(),
                         b = V.partialPivLu().solve((step_Nm * system.B.col(2)).cast<linear::Complex>());
  double worst = 0.0, most = 0.0;
  for (std::size_t n = 1; n < after.size(); ++n) {
    Eigen::VectorXcd z(5);
    for (Eigen::Index m = 0; m < 5; ++m) z(m) = b(m) * (std::exp(D(m) * after[n][P::time]) - 1.0) / D(m);
    const double predicted = (V * z)(4).real() / rad_s_in_rpm, seen = after[n][P::speed_rpm] - before[n][P::speed_rpm];
    worst = std::max(worst, std::fabs(predicted - seen));
    most = std::max(most, std::fabs(seen));
  }
  CHECK(most > 0.1);
  CHECK(worst < 0.01 * most);
}

TEST_CASE("operating point: load and friction add their slope", "[sim][linear]") {
  // Fan of 12 N m at 1710 rpm: dT/dw = 2 T/w; viscous friction 0.001 N m s; closed form.
  const OperatingPoint at = operating_point(demo("mains_start.toml"));
  const double fan = 12.0 / std::pow(1710.0 * rad_s_in_rpm, 2.0);
  CHECK(at.machine.damping == Approx(2.0 * fan * at.machine.speed_rad_s + 0.001).epsilon(1e-12));
}

TEST_CASE("operating point: a machine file alone is taken at its rated point", "[sim][linear]") {
  const OperatingPoint at = operating_point(read_machine(config("machines/krause_3hp.toml")));
  CHECK(at.speed_held);
  CHECK(unrest(at) < 1e-7);
  // The circuit at 5 % slip, from W. Leonhard's equations in 60-digit arithmetic: 14.026832328 N m, 8.844811120 A rms.
  CHECK(at.row[P::torque] == Approx(14.026832328).epsilon(1e-9));
  CHECK(magnitude(at.machine.current) == Approx(8.844811120 * std::sqrt(2.0)).epsilon(1e-9));
  CHECK(at.row[P::speed_rpm] == Approx(1710.0));
  const linear::System s = system_at(at);
  CHECK(s.order() == 4);
  CHECK(s.inputs() == 2);
}

TEST_CASE("operating point: where there is none, one sentence says so", "[sim][linear]") {
  const Scenario s = demo("mains_start.toml", {{"load.0.rated_torque_Nm", "2000.0"}});
  try {
    operating_point(s);
    FAIL("no refusal");
  } catch (const InputError& e) {
    CHECK_THAT(e.message(), Catch::Contains("no operating point") && Catch::Contains("pull-out"));
    CHECK_THAT(e.message(), !Catch::Contains("start = "));
  }
}

TEST_CASE("operating point: an imposed speed on mains is taken at its own slip", "[sim][linear]") {
  Scenario s = demo("mains_start.toml");
  s.loads.push_back({"imposed_speed", {}, 0, 0, 0, {{0.0, 1500.0}}});
  const OperatingPoint at = operating_point(s);
  CHECK(at.speed_held);
  CHECK(at.row[P::speed_rpm] == Approx(1500.0));
  CHECK(at.steady.slip_frequency == Approx((1.0 - 1500.0 / 1800.0) * 2.0 * 3.141592653589793 * 60.0));
}
