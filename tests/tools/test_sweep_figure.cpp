// Figures of sweeps: as many cells, lines and bars as there are, labels beside them, XML that another program takes.
#include <catch2/catch.hpp>
#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <limits>

#include "tools/slipbench/scale.hpp"
#include "tools/slipbench/sweep_figure.hpp"

using namespace slipbench;

namespace {

void check_well_formed(const std::string& svg) {
  if (std::system("xmllint --version > /dev/null 2>&1") != 0) {
    WARN("xmllint is not installed");
    return;
  }
  const auto path = std::filesystem::temp_directory_path() / "slipbench-test-sweep-figure.svg";
  std::ofstream(path) << svg;
  CHECK(std::system(("xmllint --noout " + path.string()).c_str()) == 0);
  std::filesystem::remove(path);
  CHECK(svg.find("nan") == std::string::npos);
  CHECK(svg.find("inf") == std::string::npos);
}

std::size_t count(const std::string& text, const std::string& what) {
  std::size_t found = 0;
  for (std::size_t at = text.find(what); at != std::string::npos; at = text.find(what, at + what.size())) ++found;
  return found;
}

Cell cell(double value, bool lost = false) { return {0.9 * value, value, 1.1 * value, lost}; }

SweepPicture picture(std::vector<std::string> figures) {
  SweepPicture p;
  p.title = "<invented> & drawn";
  p.subtitle = "6 cases x 5 noise runs of s.toml";
  p.runs = 5;
  p.figures = std::move(figures);
  return p;
}

Share share(double value) { return {value, value - 0.4, value + 0.4}; }

}  // namespace

TEST_CASE("scale: from zero, or by decades where values are far apart; always round marks inside", "[tools][figure]") {
  const double none = std::numeric_limits<double>::quiet_NaN();
  const Scale straight({3.0, none, 10.0}, 100.0, 0.0);
  CHECK_FALSE(straight.by_decades());
  CHECK(straight.at(0.0) == 100.0);
  CHECK(straight.share(10.0) < 1.0);
  const Scale decades({0.5, 700.0}, 0.0, 100.0);
  CHECK(decades.by_decades());
  CHECK(decades.at(50.0) - decades.at(5.0) ==
        Approx(decades.at(500.0) - decades.at(50.0)));  // equal ratios, equal ways
  CHECK_FALSE(Scale({-0.5, 700.0}, 0.0, 100.0).by_decades());
  CHECK(Scale({none}, 0.0, 1.0).empty());
  for (const Scale& scale :
       {straight, decades, Scale({-1e-7, 2e-7}, 0.0, 1.0), Scale({1e-9, 1e9}, 0.0, 1.0), Scale({0.0}, 0.0, 1.0)}) {
    CHECK(scale.marks().size() >= 2);
    CHECK(scale.marks().size() <= 20);
    for (const auto& [value, label] : scale.marks()) {
      CHECK(scale.share(value) >= 0.0);
      CHECK(scale.share(value) <= 1.0);
    }
  }
}

TEST_CASE("sweep map: a cell a case, words as values, the missing crossed and the lost marked", "[tools][figure]") {
  SweepPicture p = picture({"ekf.speed_rmse_rpm"});
  Grid grid;
  grid.axes = {{"estimator.0.kind", {"luenberger", "<other>", "reduced_order"}, {}, 1},
               {"belief.rotor_resistance", {"0.5", "1"}, {0.5, 1.0}, 1}};
  grid.cells = {{cell(1.0), cell(2.0), {}, cell(300.0, true), cell(5.0), cell(6.0)}};
  p.grid = grid;
  const std::string svg = sweep_figure(p);
  check_well_formed(svg);
  constexpr int bar = 60;  // slices of the scale beside it, and the white ground; the crossed one and its note
  CHECK(count(svg, "<rect") == 6 + bar + 1 + 1);
  for (const char* label : {"luenberger", "&lt;other&gt;", "reduced_order", ">0.5<", "belief.rotor_resistance",
                            "estimator.0.kind", "speed rmse, rpm", "no figure", "was lost", ">300<"})
    CHECK_THAT(svg, Catch::Contains(label));
  // The first value of the second key is the lowest row: y grows downwards.
  CHECK(svg.find(">0.5</text>") != std::string::npos);
  const auto y_of = [&](const std::string& label) {
    const std::size_t end = svg.find(label), at = svg.rfind("y=\"", end);
    return std::stod(svg.substr(at + 3));
  };
  CHECK(y_of(">0.5</text>") > y_of(">1</text>"));
  p.grid->cells = {std::vector<Cell>(6)};
  check_well_formed(sweep_figure(p));  // nothing to draw at all
}

TEST_CASE("sweep map: the darker the larger, in every channel", "[tools][figure]") {
  SweepPicture p = picture({"ekf.speed_rmse_rpm"});
  Grid grid;
  grid.axes = {{"a", {"1", "2", "3", "4"}, {1, 2, 3, 4}, 1}, {"b", {"1"}, {1}, 1}};
  grid.cells = {{cell(1.0), cell(2.0), cell(3.0), cell(4.0)}};
  p.grid = grid;
  const std::string svg = sweep_figure(p);
  std::vector<unsigned long> fills;
  for (std::size_t at = svg.find("<rect"), n = 0; n < 5; at = svg.find("<rect", at + 1), ++n) {
    const std::size_t fill = svg.find("fill=\"#", at) + 7;
    fills.push_back(std::stoul(svg.substr(fill, 6), nullptr, 16));
  }
  for (std::size_t i = 1; i + 1 < fills.size(); ++i) {  // the first is the ground
    for (const int shift : {16, 8, 0}) CHECK(((fills[i] >> shift) & 255u) > ((fills[i + 1] >> shift) & 255u));
  }
}

TEST_CASE("sweep lines: a line and a band an estimator, gaps where there is nothing", "[tools][figure]") {
  SweepPicture p = picture({"obs.speed_rmse_rpm", "ekf.speed_rmse_rpm"});
  Grid grid;
  grid.axes = {{"belief.rotor_resistance", {"0.5", "1", "1.5", "2"}, {0.5, 1.0, 1.5, 2.0}, 1}};
  grid.cells = {{cell(1.0), cell(2.0), cell(3.0), cell(4.0)}, {cell(2.0), {}, cell(2.5, true), cell(3.0)}};
  p.grid = grid;
  const std::string svg = sweep_figure(p);
  check_well_formed(svg);
  CHECK(count(svg, "<path") == 4);
  CHECK(count(svg, "fill-opacity=\"0.22\"") == 2);
  CHECK(count(svg, "<circle") == 7 + 1);  // one is hollow
  CHECK(svg.find("Z\" fill") != std::string::npos);
  const std::size_t second = svg.rfind("<path"), moves = count(svg.substr(second), "M");
  CHECK(moves == 2);  // the gap
  for (const char* label : {">obs<", ">ekf<", ">2.0<", "speed rmse, rpm", "belief.rotor_resistance", "hollow"})
    CHECK_THAT(svg, Catch::Contains(label));
}

TEST_CASE("sweep lines: words stand where they are, as dots that no line joins", "[tools][figure]") {
  SweepPicture p = picture({"obs.speed_rmse_rpm", "ekf.speed_rmse_rpm"});
  Grid grid;
  grid.axes = {{"controller.orientation", {"indirect", "direct"}, {}, 1}};
  grid.cells = {{cell(1.0), cell(2.0)}, {cell(2.0), {}}};
  p.grid = grid;
  const std::string svg = sweep_figure(p);
  check_well_formed(svg);
  CHECK(count(svg, "<path") == 0);
  CHECK(count(svg, "<circle") == 3);
  CHECK_THAT(svg, Catch::Contains(">indirect<") && Catch::Contains(">direct<"));
}

TEST_CASE("sweep strips: quantiles of each estimator; bars of each drawn key, largest first", "[tools][figure]") {
  SweepPicture p = picture({"obs.speed_rmse_rpm", "ekf.speed_rmse_rpm"});
  p.strips = {{{1.0, 2.0, 3.0, 4.0, 90.0}, 0}, {{}, 7}};
  p.drawn = {"belief.small", "belief.large", "belief.a_long_name_of_a_key+belief.another_long_name"};
  Sensitivity shares;
  shares.used = 60, shares.lost = 4;
  shares.keys = {{share(0.1), share(0.2)}, {share(0.5), share(0.7)}, {share(-0.02), share(0.05)}};
  Sensitivity silent;
  silent.none = "the figure does not vary";
  p.shares = {{"obs.speed_rmse_rpm", shares}, {"ekf.speed_rmse_rpm", silent}};
  const std::string svg = sweep_figure(p);
  check_well_formed(svg);
  for (const char* label : {">obs<", "7 rows without", "no numbers", "4 of 64 points lost", "does not vary", ">3.00<",
                            "a_long_name_of_a_key+anothe"})
    CHECK_THAT(svg, Catch::Contains(label));
  CHECK(svg.find("belief.large") < svg.find("belief.small"));
  CHECK(svg.find("belief.small") < svg.find("a_long_name"));
  CHECK(count(svg, "fill-opacity=\"0.30\"") == 3);  // a total a key
  p.shares[0].shares.keys[0].total.reset(), p.shares[0].shares.keys[1].total.reset(),
      p.shares[0].shares.keys[2].total.reset();
  const std::string first_only = sweep_figure(p);
  check_well_formed(first_only);
  CHECK_THAT(first_only, Catch::Contains("totals need kind = &quot;saltelli&quot;"));
}

TEST_CASE("figure names: who, what and its unit", "[tools][figure]") {
  CHECK(figure_name("ekf.torque_rmse_Nm").what == "torque rmse, N m");
  CHECK(figure_name("ekf.torque_rmse_Nm").who == "ekf");
  CHECK(figure_name("drive.voltage_clipped_fraction").what == "voltage clipped fraction");
}

TEST_CASE("--figure-of: one column, all estimators', the drive's, or the nearest is told", "[tools][figure]") {
  const StoreColumns columns{{},
                             {"obs.speed_rmse_rpm", "obs.angle_rmse_deg", "ekf.speed_rmse_rpm", "ekf.angle_rmse_deg",
                              "drive.speed_tracking_rmse_rpm", "drive.load_dip_rpm"}};
  using Names = std::vector<std::string>;
  CHECK(chosen_figures(columns, "") == Names{"obs.speed_rmse_rpm", "ekf.speed_rmse_rpm"});
  CHECK(chosen_figures(columns, "angle_rmse_deg") == Names{"obs.angle_rmse_deg", "ekf.angle_rmse_deg"});
  CHECK(chosen_figures(columns, "ekf.angle_rmse_deg") == Names{"ekf.angle_rmse_deg"});
  CHECK(chosen_figures(columns, "load_dip_rpm") == Names{"drive.load_dip_rpm"});
  CHECK(chosen_figures({{}, {"drive.speed_tracking_rmse_rpm"}}, "") == Names{"drive.speed_tracking_rmse_rpm"});
  CHECK_THROWS_WITH(chosen_figures(columns, "ekf.angel_rmse"), Catch::Contains("nearest is ekf.angle_rmse_deg"));
  CHECK(judged_figures(columns, {"drive.load_dip_rpm"}) ==
        Names{"obs.speed_rmse_rpm", "ekf.speed_rmse_rpm", "drive.speed_tracking_rmse_rpm", "drive.load_dip_rpm"});
}
