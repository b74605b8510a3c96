#include "tools/slipbench/compare_figure.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "sim/scenario/scenario.hpp"
#include "tools/slipbench/svg.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

constexpr double panel_width = 210, gap = 34, top = 112, row_height = 60, widest_name = 380;
constexpr std::size_t most_dots = 400;  // of single runs in one row: more would only thicken the cloud

struct PanelName {
  std::string_view figure, heading;
};
constexpr PanelName riding[] = {{"speed_rmse_rpm", "speed error, rms, rpm"},
                                {"speed_bias_rpm", "speed bias, rpm"},
                                {"angle_rmse_deg", "flux angle error, rms, deg"},
                                {"torque_rmse_Nm", "torque error, rms, N m"}};
constexpr PanelName looped[] = {{"speed_rmse_rpm", "speed error, rms, rpm"},
                                {"speed_bias_rpm", "speed bias, rpm"},
                                {"angle_rmse_deg", "flux angle error, rms, deg"},
                                {"speed_tracking_rmse_rpm", "speed tracking error, rms, rpm"}};

std::string panel(const Comparison& c, const PanelName& name, double left, double bottom) {
  const std::size_t figure = c.figure(name.figure);
  double low = 0.0, high = 0.0;
  for (std::size_t e = 0; e < c.estimators.size(); ++e) {
    const Interval interval = c.interval(e, figure);
    for (const Figure& x : c.estimators[e].values[figure]) {
      if (x) low = std::min(low, *x), high = std::max(high, *x);
    }
    if (interval.low) low = std::min(low, *interval.low), high = std::max(high, *interval.high);
  }
  std::string out = svg::text(left, top - 14, name.heading, {12, "start", svg::ink, true});
  if (!(high > low)) return out + svg::text(left, top + 20, "no numbers", {11, "start", svg::soft_ink});
  const double room = 0.07 * (high - low);
  const svg::Axis x{low < 0.0 ? low - room : 0.0, high > 0.0 ? high + room : 0.0, left, left + panel_width};
  const svg::Ticks marks = svg::ticks(x.low, x.high, 4);
  for (const double mark : marks.values) {
    const bool zero = mark > -1e-9 * marks.step && mark < 1e-9 * marks.step;
    out += svg::line(x.at(mark), top, x.at(mark), bottom, zero ? svg::frame : svg::grid);
    out += svg::text(x.at(mark), bottom + 17, marks.label(mark), {11, "middle", svg::soft_ink});
  }
  for (std::size_t e = 0; e < c.estimators.size(); ++e) {
    const double middle = top + row_height * (static_cast<double>(e) + 0.5);
    const auto& values = c.estimators[e].values[figure];
    for (std::size_t run = 0; run < std::min(values.size(), most_dots); ++run) {
      if (!values[run]) continue;
      const double spread = static_cast<double>(run * 7 % 11) - 5.0;  // so that equal values stay apart
      out += svg::circle(x.at(*values[run]), middle + 16.0 + 0.9 * spread, 1.8, svg::colour(e), 0.3);
    }
    const Interval interval = c.interval(e, figure);
    if (!interval.mean) continue;
    std::string number = significant(interval.mean, 3);
    if (interval.low) {
      out += svg::line(x.at(*interval.low), middle, x.at(*interval.high), middle, svg::colour(e), 3.0);
      for (const double end : {*interval.low, *interval.high}) {
        out += svg::line(x.at(end), middle - 6, x.at(end), middle + 6, svg::colour(e), 1.5);
      }
      number = plus_minus(*interval.mean, *interval.high - *interval.mean);
    }
    const double at = x.at(*interval.mean), half = 3.6 * static_cast<double>(number.size());
    out += svg::circle(at, middle, 3.6, svg::colour(e));
    out += svg::text(std::clamp(at, left + half, left + panel_width - half), middle - 12, number,
                     {11, "middle", svg::ink});
  }
  return out;
}

}  // namespace

std::string compare_figure(const Comparison& c, const Scenario& scenario) {
  double longest = 70.0;
  for (const ComparedEstimator& e : c.estimators) longest = std::max(longest, svg::width_px(e.name, 13, true));
  longest = std::min(longest, widest_name);
  const double names = 24 + longest + 16;
  const double bottom = top + row_height * static_cast<double>(c.estimators.size());
  const double width = names + 4 * panel_width + 3 * gap + 36;
  const std::string title = scenario.title.empty() ? "Comparison" : scenario.title;
  std::string body = svg::text(24, 32, svg::fitted(title, width - 48, 17, true), {17, "start", svg::ink, true});
  body += svg::text(
      24, 53,
      fmt::format("{} noise {}, {}, seed {}; large dot and bar: mean and its 95 % interval; small dots: runs", c.runs(),
                  c.runs() == 1 ? "run" : "runs",
                  c.in_loop ? "each estimator closing the loop in turn" : "all estimators riding along", scenario.seed),
      {12, "start", svg::soft_ink});
  for (std::size_t e = 0; e < c.estimators.size(); ++e) {
    const double row = top + row_height * static_cast<double>(e);
    if (e % 2 == 0) body += svg::rectangle(12, row, width - 24, row_height, "#f7f7f7");
    body += svg::text(24, row + row_height / 2 + 3, svg::fitted(c.estimators[e].name, longest, 13, true),
                      {13, "start", svg::colour(e), true});
    const std::size_t lost = c.estimators[e].lost_runs(), diverged = c.estimators[e].diverged_runs();
    if (lost + diverged == 0) continue;
    body += svg::text(24, row + row_height / 2 + 18,
                      diverged > 0 ? fmt::format("diverged {} of {}", diverged, c.runs())
                                   : fmt::format("lost in {} of {}", lost, c.runs()),
                      {11, "start", svg::soft_ink});
  }
  double left = names;
  for (const PanelName& name : c.in_loop ? looped : riding) {
    body += panel(c, name, left, bottom);
    left += panel_width + gap;
  }
  return svg::document(width, bottom + 40, title, body);
}

}  // namespace slipbench
