// Figures: round ticks, envelopes, text that cannot break the XML, files of bounded size.
#include <catch2/catch.hpp>
#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <limits>

#include "sim/scenario/scenario.hpp"
#include "tests/sim/score/stream.hpp"
#include "tools/slipbench/compare_figure.hpp"
#include "tools/slipbench/run_figure.hpp"
#include "tools/slipbench/svg.hpp"

using namespace slipbench;

namespace {

// xmllint (libxml2) where installed: another program's judgement.
void check_well_formed(const std::string& svg) {
  if (std::system("xmllint --version > /dev/null 2>&1") != 0) {
    WARN("xmllint is not installed");
    return;
  }
  const auto path = std::filesystem::temp_directory_path() / "slipbench-test-figure.svg";
  std::ofstream(path) << svg;
  CHECK(std::system(("xmllint --noout " + path.string()).c_str()) == 0);
  std::filesystem::remove(path);
}

}  // namespace

TEST_CASE("ticks: round values inside the range, for any range", "[tools][figure]") {
  for (const auto& [low, high] : {std::pair{0.0, 1.0}, {-3.7e-7, 9e-7}, {1e6, 1.00001e6}, {-1500.0, 1500.0}}) {
    const svg::Ticks ticks = svg::ticks(low, high, 5);
    CHECK(ticks.values.size() >= 3);
    CHECK(ticks.values.size() <= 11);
    for (const double value : ticks.values) {
      CHECK(value >= low - 1e-9 * ticks.step);
      CHECK(value <= high + 1e-9 * ticks.step);
      CHECK(std::fabs(std::remainder(value, ticks.step)) < 1e-6 * ticks.step);
    }
  }
  CHECK(svg::ticks(0.0, 1.0, 5).label(0.2) == "0.2");
  CHECK(svg::ticks(-20.0, 20.0, 4).label(-1e-14) == "0");
  CHECK(svg::ticks(0.0, 0.03, 4).label(0.01) == "0.01");
}

TEST_CASE("text: nothing in a title can break the XML", "[tools][figure]") {
  CHECK(svg::escaped("<a & \"b\">\x01") == "&lt;a &amp; &quot;b&quot;&gt; ");
  check_well_formed(svg::document(10, 10, "]]> <x> & ü", svg::text(1, 2, "<&>\x1b[0m")));
}

TEST_CASE("text: too long for its room, cut between signs and marked", "[tools][figure]") {
  CHECK(svg::fitted("short", 100, 12) == "short");
  const std::string cut = svg::fitted("übergroße Förderanlage", 60, 12);
  CHECK(cut.ends_with("…"));
  CHECK(svg::width_px(cut, 12) <= 60.0);
  CHECK(svg::width_px(cut, 12) > 40.0);
  CHECK(svg::fitted("äää", 1, 12) == "…");
  check_well_formed(svg::document(10, 10, cut, svg::text(1, 2, cut)));  // no sign was cut in two
}

TEST_CASE("run figure: the legend takes as many rows as its names need", "[tools][figure]") {
  const auto height = [](int estimators) {
    RunFigure figure({0.0, 1.0}, {});
    test::Stream stream;
    stream.ticks = 11;
    stream.names.clear();
    for (int i = 0; i < estimators; ++i) stream.names.push_back(std::string(60, 'x') + std::to_string(i));
    stream.feed(figure, [](double, PlantRow&, std::vector<Estimate<double>>&, bool&) {});
    const std::string svg = figure.svg(Scenario{}, std::vector<EstimatorFigures>(static_cast<std::size_t>(estimators)));
    check_well_formed(svg);
    const std::size_t at = svg.find(" height=\"") + 9;
    return std::stod(svg.substr(at, svg.find('"', at) - at));
  };
  CHECK(height(1) == height(0));
  CHECK(height(8) > height(1) + 3 * 12.0);  // two such names at most in a row of 860 px
}

TEST_CASE("envelope: keeps every peak, leaves a gap for what is no number", "[tools][figure]") {
  Envelope envelope(2);
  for (const double value : {1.0, -5.0, 7.0}) envelope.add(0, value);
  envelope.add(1, std::numeric_limits<double>::quiet_NaN());
  envelope.add(2, 1.0);  // beyond: ignored
  CHECK(envelope.bins()[0].low == -5.0);
  CHECK(envelope.bins()[0].high == 7.0);
  CHECK(envelope.bins()[0].mean() == 1.0);
  CHECK(envelope.bins()[1].empty());
}

TEST_CASE("run figure: well-formed and under 200 kB, with many noisy estimators, one lost, one no number",
          "[tools][figure]") {
  Scenario scenario;
  scenario.title = "<noisy> & long";
  RunFigure figure({0.2, 1.0}, {0.5});
  test::Stream stream;
  stream.control_period_s = 1e-5;
  stream.ticks = 100001;
  for (int i = 0; i < 8; ++i) stream.names.push_back("estimator_" + std::to_string(i));
  std::uint32_t state = 1;
  stream.feed(figure, [&](double t, PlantRow& plant, std::vector<Estimate<double>>& estimates, bool&) {
    plant[P::speed_rpm] = 1500.0 * t;
    plant[P::speed_reference_rpm] = std::numeric_limits<double>::quiet_NaN();
    for (auto& e : estimates) {
      state = state * 1664525u + 1013904223u;
      e.speed = 157.0 * t + 1e-9 * static_cast<double>(state);
    }
    estimates[0].speed = 1e12 * t;
    estimates[1].speed = std::numeric_limits<double>::quiet_NaN();
  });
  std::vector<EstimatorFigures> figures(9);
  figures[0].lost_at_s = 0.1;
  const std::string svg = figure.svg(scenario, figures);
  CHECK(svg.size() < 200000);
  CHECK(svg.find("nan") == std::string::npos);
  CHECK(svg.find("inf") == std::string::npos);
  CHECK(svg.find("one lost") != std::string::npos);
  check_well_formed(svg);
}

TEST_CASE("compare figure: well-formed, also with a figure that no run gave", "[tools][figure]") {
  Comparison comparison;
  for (const auto& entry : estimator_figures) {
    comparison.figure_names.push_back(entry.name);
    comparison.figure_units.push_back(entry.unit);
  }
  comparison.finished.assign(3, true);
  for (const char* name : {"one", "two"}) {
    ComparedEstimator e;
    e.name = name;
    e.values.assign(comparison.figure_names.size(), {1.0, 2.0, Figure{}});
    e.values[comparison.figure("angle_rmse_deg")] = std::vector<Figure>(3);
    e.lost = {false, true, false};
    e.diverged.assign(3, false);
    comparison.estimators.push_back(e);
  }
  const std::string svg = compare_figure(comparison, Scenario{});
  CHECK(svg.find("no numbers") != std::string::npos);
  CHECK(svg.find("lost in 1 of 3") != std::string::npos);
  check_well_formed(svg);
}
