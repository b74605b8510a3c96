// The observability map: the published line found within a cell, a scenario's way and the time it spends blind.
#include <catch2/catch.hpp>

#include "sim/linear/observability_map.hpp"
#include "sim/scenario/read.hpp"

using namespace slipbench;

namespace {

std::string config(const std::string& name) { return SLIPBENCH_SOURCE_DIR "/configs/" + name; }
Scenario demo(const std::string& name, const std::vector<Override>& overrides = {}) {
  return read_scenario(config("scenarios/" + name), overrides);
}

}  // namespace

TEST_CASE("speed map: the least of each row lies on the published line, within one cell", "[sim][linear][published]") {
  // w_r = -(2/3) R_r T / (p psi_r^2): C. Canudas de Wit et al., CDC 2000; S. Ibarra-Rojas et al., Automatica 40(6), 2004 (from memory);
  // written out here, not taken from the map.
  for (const char* name : {"loaded_reversal.toml", "four_quadrants.toml", "winder_torque.toml"}) {
    const Scenario s = demo(name);
    for (const auto model : {linear::SpeedModel::constant_speed, linear::SpeedModel::unknown_load}) {
      SpeedMapOptions options;
      options.model = model;
      options.with_path = false;
      options.plane = {0.21, 1.5, 60, 17};  // an even count: no point sits on speed zero
      const ObservabilityMap map = speed_map(s, options);
      const Circuit<double> c = s.machine.circuit();
      INFO(name << ", " << linear::name_of(model));
      REQUIRE(map.smallest.size() == map.plane.points());
      double farthest = 0.0, greatest = 0.0;
      for (std::size_t k = 0; k < map.plane.torques; ++k) {
        std::size_t least = 0;
        for (std::size_t i = 0; i < map.plane.speeds; ++i) {
          greatest = std::max(greatest, map.smallest[map.plane.index(i, k)]);
          if (map.smallest[map.plane.index(i, k)] < map.smallest[map.plane.index(least, k)]) least = i;
        }
        const double psi = map.rotor_flux_Wb[map.plane.index(least, k)], T = map.plane.torque_Nm(k);
        const double line =
            -2.0 / 3.0 * c.rotor_resistance * T / (c.pole_pairs * psi * psi) / c.pole_pairs / rad_s_in_rpm;
        farthest = std::max(farthest, std::fabs(map.plane.speed_rpm(least) - line));
        CHECK(map.lines.lost[k].speed_rpm == Approx(line).epsilon(1e-9).margin(1e-9));
        const double Hz = map.lines.blind_below_Hz, band = Hz * 60.0 / c.pole_pairs;
        CHECK(map.lines.blind_to[k].speed_rpm - map.lines.lost[k].speed_rpm == Approx(band).epsilon(1e-6));
      }
      CHECK(farthest < map.plane.speed_step_rpm());
      CHECK(greatest > 10.0 * map.smallest[map.plane.index(30, 8)]);  // the middle of the plane lies by the line
    }
  }
}

TEST_CASE("speed map: with a known load nothing is lost on the line, but little is seen", "[sim][linear]") {
  const Scenario s = demo("loaded_reversal.toml");
  const SpeedMapMaker known(s, linear::SpeedModel::known_load), constant(s, linear::SpeedModel::constant_speed);
  for (const double torque : {-10.0, 5.0, 20.0}) {
    const double on_line = known.flux().speed_at_frequency(torque, 0.0) / rad_s_in_rpm;
    CHECK(constant.at(constant.point(on_line, torque)) < 1e-12);
    CHECK(known.at(known.point(on_line, torque)) > 1e-8);
    CHECK(known.at(known.point(1000.0, torque)) > 3.0 * known.at(known.point(on_line, torque)));
  }
}

TEST_CASE("scenario path: blind while it dwells near zero stator frequency, and while there is no flux",
          "[sim][linear]") {
  SpeedMapOptions options;
  options.plane = {0.1, 0.5, 9, 5};
  const ObservabilityMap map = speed_map(demo("loaded_reversal.toml"), options);
  REQUIRE(map.path);
  const ScenarioPath& path = *map.path;
  CHECK(path.points.size() == 6001);
  CHECK(path.duration_s == Approx(6.0).epsilon(1e-9));
  // Counted again here from the points, otherwise than the code does.
  double blind = 0.0;
  std::size_t longest = 0, run = 0;
  for (std::size_t n = 0; n + 1 < path.points.size(); ++n) {
    const bool is = std::fabs(path.points[n].stator_frequency_Hz) < 0.5 || path.points[n].rotor_flux_Wb < 0.05;
    CHECK(is == path.points[n].blind);
    blind += is ? 1e-3 : 0.0;
    run = is ? run + 1 : 0;
    longest = std::max(longest, run);
  }
  CHECK(path.blind_s == Approx(blind));
  CHECK(path.longest_blind_s == Approx(1e-3 * static_cast<double>(longest)));
  // Magnetised at rest up to 0.2 s, then through zero frequency at 150 rpm a second: 2 x 0.5 Hz x 30 rpm/Hz / 150 rpm/s = 0.2 s.
  CHECK(path.blind_s > 0.3);
  CHECK(path.blind_s < 1.0);
  // Where it is seen worst it is blind; the plane holds all of its way.
  double worst = 1e300;
  bool blind_there = false;
  for (const PathPoint& p : path.points) {
    if (p.observability < worst) worst = p.observability, blind_there = p.blind;
    CHECK(std::fabs(p.speed_rpm) <= map.plane.speed_to_rpm);
    CHECK(std::fabs(p.torque_Nm) <= map.plane.torque_to_Nm);
  }
  CHECK(blind_there);
}

TEST_CASE("speed map: a wider threshold is blind for longer; a stop leaves what was done", "[sim][linear]") {
  const Scenario s = demo("loaded_reversal.toml", {{"run.duration_s", "1.0"}});
  SpeedMapOptions options;
  options.plane = {0.1, 0.5, 5, 5};
  const auto narrow = speed_map(s, options);
  options.blind_below_Hz = 2.0;
  const auto wide = speed_map(s, options);
  CHECK(wide.path->blind_s > narrow.path->blind_s);
  options.with_path = false;
  int told = 0;
  CHECK(speed_map(s, options, [&](double) { return ++told < 3; }).smallest.size() == 15);
}

TEST_CASE("speed map: of a machine file, at its rated flux", "[sim][linear]") {
  SpeedMapOptions options;
  options.plane = {0.5, 1.0, 11, 5};
  const auto machine = read_machine(config("machines/krause_3hp.toml"));
  const auto map = speed_map(machine, options);
  CHECK(map.title == "Krause 3 hp");
  CHECK_FALSE(map.path);
  CHECK(map.smallest.size() == 55);
  CHECK(map.rotor_flux_Wb.front() == Approx(rated_rotor_flux(machine.circuit(), machine.nameplate())));
  options.model = linear::SpeedModel::known_load;
  CHECK_THROWS_WITH(speed_map(machine, options), Catch::Contains("inertia"));
}
