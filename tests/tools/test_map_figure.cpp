// Maps of the torque-speed plane as CSV and SVG: rows and columns, labels, legends, XML that another program takes.
#include <catch2/catch.hpp>
#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <limits>

#include "sim/scenario/read.hpp"
#include "tools/slipbench/map_csv.hpp"
#include "tools/slipbench/map_figure.hpp"

using namespace slipbench;

namespace {

void check_well_formed(const std::string& svg) {
  if (std::system("xmllint --version > /dev/null 2>&1") != 0) {
    WARN("xmllint is not installed");
  } else {
    const auto path = std::filesystem::temp_directory_path() / "slipbench-test-map-figure.svg";
    std::ofstream(path) << svg;
    CHECK(std::system(("xmllint --noout " + path.string()).c_str()) == 0);
    std::filesystem::remove(path);
  }
  CHECK(svg.find("nan") == std::string::npos);
  CHECK(svg.find("inf") == std::string::npos);
}

std::size_t count(const std::string& text, const std::string& what) {
  std::size_t found = 0;
  for (std::size_t at = text.find(what); at != std::string::npos; at = text.find(what, at + what.size())) ++found;
  return found;
}

Scenario reversal() {
  return read_scenario(SLIPBENCH_SOURCE_DIR "/configs/scenarios/loaded_reversal.toml", {{"run.duration_s", "1.0"}});
}

constexpr double none = std::numeric_limits<double>::quiet_NaN();

EstimatorMap drawn_map() {
  using State = EstimatorPoint::State;
  EstimatorMap map;
  map.title = "<invented> & drawn";
  map.name = "obs";
  map.kind = "luenberger";
  map.flux_text = "reference flux";
  map.plane = {-100.0, 100.0, -10.0, 10.0, 3, 2};
  map.points = {{State::stable, -50.0, 0.0}, {State::stable, -2.0, 0.5},     {State::unstable, 3.0, -1.0},
                {State::marginal, 0.0, 0.0}, {State::unsettled, none, none}, {State::stable, -10.0, 0.0}};
  map.lines = {0.5, {{20.0, -10.0}, {-20.0, 10.0}}, {{0.0, -10.0}, {-40.0, 10.0}}, {{40.0, -10.0}, {0.0, 10.0}}};
  return map;
}

}  // namespace

TEST_CASE("observability map: figure and CSV of a real scenario", "[tools][figure]") {
  SpeedMapOptions options;
  options.plane = {0.4, 1.0, 31, 15};
  const ObservabilityMap map = speed_map(reversal(), options);
  const std::string svg = map_figure(map);
  check_well_formed(svg);
  for (const char* label : {"Slow loaded reversal", "motor speed, rpm", "motor torque, N m",
                            "smallest singular value, per unit", "stator frequency zero", "0.5 Hz either way",
                            "run of 1 s", "blind (below 0.5 Hz", "speed constant", "weakened as the controller does"})
    CHECK_THAT(svg, Catch::Contains(label));
  CHECK(count(svg, "<path") == 3 + 4);  // zero and the band; the way and its blind parts, each on white or black
  CHECK(svg.size() < 200000);

  const std::string csv = csv_of(map);
  CHECK(count(csv, "\n") == 31 * 15 + 1);
  CHECK(csv.starts_with("speed_rpm,torque_Nm,stator_frequency_Hz,rotor_flux_Wb,smallest_singular_value\n"));
  double speed = 0.0, torque = 0.0, frequency = 0.0, flux = 0.0, value = 0.0;
  REQUIRE(std::sscanf(csv.c_str() + csv.find('\n') + 1, "%lf,%lf,%lf,%lf,%lf", &speed, &torque, &frequency, &flux,
                      &value) == 5);
  CHECK(speed == map.plane.speed_from_rpm);
  CHECK(torque == map.plane.torque_from_Nm);
  CHECK(value == map.smallest[0]);
  CHECK(count(csv_of(*map.path), "\n") == 1001 + 1);
  CHECK(count(csv_of(*map.path), ",1,") > 100);  // blind at rest, up to 0.2 s
}

TEST_CASE("observability map: without a run no way is drawn; one that was stopped is drawn as far as it goes",
          "[tools][figure]") {
  SpeedMapOptions options;
  options.plane = {0.4, 1.0, 21, 9};
  options.with_path = false;
  int told = 0;
  const ObservabilityMap map = speed_map(reversal(), options, [&](double) { return ++told < 5; });
  const std::string svg = map_figure(map);
  check_well_formed(svg);
  CHECK(count(svg, "<path") == 3);
  CHECK(svg.find("blind (") == std::string::npos);
  ObservabilityMap nothing = map;
  nothing.smallest.clear();
  check_well_formed(map_figure(nothing));
}

TEST_CASE("estimator map: stable points shaded by their slowest pole, the others told apart and named",
          "[tools][figure]") {
  const EstimatorMap map = drawn_map();
  const std::string svg = map_figure(map);
  check_well_formed(svg);
  for (const char* label : {"&lt;invented&gt; &amp; drawn", "obs (luenberger)", "unstable: an error grows",
                            "marginal:", "no steady estimate found", "decay of the slowest pole, 1/s"})
    CHECK_THAT(svg, Catch::Contains(label));
  // A point each: three shades and three fills, each of the fills once more in the legend.
  for (const char* fill : {"#f3b9a0", "#f6e3a1", "#c4c4c4"}) CHECK(count(svg, fill) == 2);
  EstimatorMap good = map;
  good.points.assign(6, {EstimatorPoint::State::stable, -5.0, 0.0});
  const std::string even = map_figure(good);
  check_well_formed(even);
  CHECK(even.find("unstable") == std::string::npos);
  const std::string csv = csv_of(map);
  CHECK(csv ==
        "speed_rpm,torque_Nm,state,slowest_per_s,speed_error_rpm\n"
        "-100,-10,stable,-50,0\n-100,10,stable,-2,0.5\n0,-10,unstable,3,-1\n0,10,marginal,0,0\n"
        "100,-10,unsettled,nan,nan\n100,10,stable,-10,0\n");
}
