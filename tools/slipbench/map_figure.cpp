#include "tools/slipbench/map_figure.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "tools/slipbench/heat.hpp"
#include "tools/slipbench/scale.hpp"
#include "tools/slipbench/svg.hpp"

namespace slipbench {

namespace {

constexpr double left = 84, top = 96, plot_width = 640, plot_height = 440, bar_gap = 26, bar_width = 18, bar_room = 92;
constexpr double bottom = top + plot_height, right = left + plot_width, width = right + bar_gap + bar_width + bar_room;
constexpr std::string_view line_colour = "#D55E00", path_colour = "#111111", blind_colour = "#E69F00",
                           unstable_fill = "#f3b9a0", marginal_fill = "#f6e3a1", unsettled_fill = "#c4c4c4",
                           beyond_fill = "#ece7df";
constexpr std::string_view beyond_words = "beyond the drive's voltage or current";
constexpr int shades = 32;
constexpr double darkest_share = 0.005;  // of the points: a few deep values must not take the whole scale

// A plot of the plane: axes, a fill for every point, lines clipped to it.
class PlanePlot {
 public:
  explicit PlanePlot(const Plane& plane)
      : plane_(plane),
        x_{plane.speed_from_rpm - 0.5 * plane.speed_step_rpm(), plane.speed_to_rpm + 0.5 * plane.speed_step_rpm(), left,
           right},
        y_{plane.torque_from_Nm - 0.5 * plane.torque_step_Nm(), plane.torque_to_Nm + 0.5 * plane.torque_step_Nm(),
           bottom, top} {}

  // Points of equal fill along a row of one torque are one rectangle.
  template <class FillAt>
  [[nodiscard]] std::string cells(std::size_t count, FillAt fill_at) const {
    std::string body = "<g shape-rendering=\"crispEdges\">\n";
    for (std::size_t k = 0; k < plane_.torques; ++k) {
      const double y1 = y_.at(plane_.torque_Nm(k) + 0.5 * plane_.torque_step_Nm()),
                   y2 = y_.at(plane_.torque_Nm(k) - 0.5 * plane_.torque_step_Nm());
      for (std::size_t i = 0; i < plane_.speeds && plane_.index(i, k) < count;) {
        const std::string fill = fill_at(plane_.index(i, k));
        const std::size_t first = i;
        while (i < plane_.speeds && plane_.index(i, k) < count && fill_at(plane_.index(i, k)) == fill) ++i;
        const double x1 = x_.at(plane_.speed_rpm(first) - 0.5 * plane_.speed_step_rpm()),
                     x2 = x_.at(plane_.speed_rpm(i - 1) + 0.5 * plane_.speed_step_rpm());
        body += svg::rectangle(x1, y1, x2 - x1 + 0.3, y2 - y1 + 0.3, fill);
      }
    }
    return body + "</g>\n";
  }
  // `points` as (speed, torque), joined where `join` says so.
  template <class Points, class Keep>
  [[nodiscard]] std::string polyline(const Points& points, Keep keep, std::string_view stroke, double stroke_width,
                                     std::string_view dashes = "") const {
    std::string d;
    bool pen_down = false;
    double last_x = -1e9, last_y = -1e9;
    for (std::size_t n = 0; n < points.size(); ++n) {
      if (!keep(points[n])) {
        pen_down = false;
        continue;
      }
      const double x = x_.at(points[n].speed_rpm), y = y_.at(points[n].torque_Nm);
      // A step that can't be seen is left out, so that a long run stays a small file.
      if (pen_down && std::fabs(x - last_x) + std::fabs(y - last_y) < 0.7) continue;
      d += fmt::format("{}{} {}", pen_down ? "L" : "M", svg::px(x), svg::px(y));
      if (!pen_down) d += "h0.1";  // a lone point shows too
      pen_down = true;
      last_x = x, last_y = y;
    }
    if (d.empty()) return {};
    return fmt::format(
        "<path d=\"{}\" fill=\"none\" stroke=\"{}\" stroke-width=\"{}\" stroke-linejoin=\"round\" "
        "stroke-linecap=\"round\" clip-path=\"url(#plane)\"{}/>\n",
        d, stroke, svg::px(stroke_width), dashes.empty() ? "" : fmt::format(" stroke-dasharray=\"{}\"", dashes));
  }
  [[nodiscard]] std::string frequency_lines(const FrequencyLines& lines) const {
    const auto all = [](const PlanePoint&) { return true; };
    return polyline(lines.blind_from, all, line_colour, 1.2, "5 4") +
           polyline(lines.blind_to, all, line_colour, 1.2, "5 4") + polyline(lines.lost, all, line_colour, 1.6);
  }
  [[nodiscard]] std::string axes() const {
    std::string body;
    const svg::Ticks xs = svg::ticks(x_.low, x_.high, 8), ys = svg::ticks(y_.low, y_.high, 8);
    for (const double value : xs.values) {
      body += svg::line(x_.at(value), bottom, x_.at(value), bottom + 5, svg::frame) +
              svg::text(x_.at(value), bottom + 19, xs.label(value), {11, "middle", svg::soft_ink});
    }
    for (const double value : ys.values) {
      body += svg::line(left - 5, y_.at(value), left, y_.at(value), svg::frame) +
              svg::text(left - 9, y_.at(value) + 4, ys.label(value), {11, "end", svg::soft_ink});
    }
    for (const auto& [x1, y1, x2, y2] : {std::array{left, top, right, top},
                                         {left, bottom, right, bottom},
                                         {left, top, left, bottom},
                                         {right, top, right, bottom}})
      body += svg::line(x1, y1, x2, y2, svg::frame);
    return body + svg::text(left + plot_width / 2, bottom + 40, "motor speed, rpm", {12, "middle"}) +
           svg::upright_text(30, top + plot_height / 2, "motor torque, N m", {12, "middle"});
  }

 private:
  const Plane& plane_;
  svg::Axis x_, y_;
};

std::string head(const std::string& title, const std::string& subtitle) {
  return fmt::format("<clipPath id=\"plane\"><rect x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\"/></clipPath>\n",
                     svg::px(left), svg::px(top), svg::px(plot_width), svg::px(plot_height)) +
         svg::text(24, 32, svg::fitted(title, width - 48, 17, true), {17, "start", svg::ink, true}) +
         svg::text(24, 53, svg::fitted(subtitle, width - 48, 12), {12, "start", svg::soft_ink});
}

// Value from which on down all is darkest.
double darkest(std::vector<double> values) {
  std::erase_if(values, [](double value) { return !(std::isfinite(value) && value > 0.0); });
  if (values.empty()) return 1.0;
  const auto at = values.begin() + static_cast<std::ptrdiff_t>(darkest_share * static_cast<double>(values.size()));
  std::nth_element(values.begin(), at, values.end());
  return *at;
}

// Share of darkness: 0 where the value is largest.
double darkness(const Scale& scale, double value) { return std::round((1.0 - scale.share(value)) * shades) / shades; }

std::string colour_bar(const Scale& scale, const std::string& name) {
  const double x = right + bar_gap;
  std::string body;
  for (int i = 0; i < shades; ++i) {
    const double each = plot_height / shades;
    body += svg::rectangle(x, bottom - each * (i + 1), bar_width, each + 0.5, heat(1.0 - (i + 0.5) / shades));
  }
  for (const auto& [value, label] : scale.marks()) {
    body += svg::line(x + bar_width, scale.at(value), x + bar_width + 5, scale.at(value), svg::frame) +
            svg::text(x + bar_width + 9, scale.at(value) + 4, label, {11, "start", svg::soft_ink});
  }
  return body + svg::upright_text(x + bar_width + bar_room - 20, top + plot_height / 2, name, {12, "middle"});
}

// Rows below the plot: a stroke or a field, and what it means.
class Legend {
 public:
  void stroke(std::string_view colour, double stroke_width, const std::string& words, std::string_view dashes = "") {
    body_ += svg::line(left, row_ - 4, left + 26, row_ - 4, colour, stroke_width, dashes);
    words_at(words);
  }
  void field(std::string_view fill, const std::string& words) {
    body_ += svg::rectangle(left, row_ - 11, 26, 12, svg::frame) + svg::rectangle(left + 1, row_ - 10, 24, 10, fill);
    words_at(words);
  }
  void frequency(const FrequencyLines& lines) {
    stroke(line_colour, 2.0, "stator frequency zero: w_r = -(2/3) R_r T / (p psi_r²)");
    stroke(line_colour, 1.2, fmt::format("stator frequency {:g} Hz either way", lines.blind_below_Hz), "5 4");
  }
  [[nodiscard]] const std::string& body() const { return body_; }
  [[nodiscard]] double end() const { return row_; }

 private:
  void words_at(const std::string& words) {
    body_ += svg::text(left + 36, row_, svg::fitted(words, width - left - 50, 11), {11, "start", svg::soft_ink});
    row_ += 18;
  }
  std::string body_;
  double row_ = bottom + 66;
};

std::string_view fill_of(EstimatorPoint::State state) {
  using State = EstimatorPoint::State;
  return state == State::unstable   ? unstable_fill
         : state == State::marginal ? marginal_fill
         : state == State::beyond   ? beyond_fill
                                    : unsettled_fill;
}

std::string words_of(linear::SpeedModel model) {
  return model == linear::SpeedModel::constant_speed ? "speed constant"
         : model == linear::SpeedModel::unknown_load ? "load torque unknown but constant"
                                                     : "load torque known";
}

}  // namespace

std::string map_figure(const ObservabilityMap& map) {
  const PlanePlot plot(map.plane);
  const double least = darkest(map.smallest);
  std::vector<double> shown = map.smallest;
  for (double& value : shown) value = std::max(value, least);
  const Scale scale(shown, bottom, top);
  std::string body = head(
      map.title, fmt::format("Where speed can be seen in the terminals; {}; {}", words_of(map.model), map.flux_text));
  body += plot.cells(shown.size(), [&](std::size_t n) {
    return std::isfinite(map.smallest[n]) ? heat(darkness(scale, shown[n])) : std::string(beyond_fill);
  });
  Legend legend;
  if (map.path) {
    const ScenarioPath& path = *map.path;
    const auto all = [](const PathPoint&) { return true; };
    const auto blind = [](const PathPoint& p) { return p.blind; };
    body += plot.frequency_lines(map.lines) + plot.polyline(path.points, all, "#ffffff", 3.4) +
            plot.polyline(path.points, all, path_colour, 1.6) + plot.polyline(path.points, blind, path_colour, 5.0) +
            plot.polyline(path.points, blind, blind_colour, 3.0);
    legend.stroke(
        path_colour, 1.6,
        fmt::format("the scenario's run of {:g} s{}", path.duration_s, path.diverged ? ", which diverged" : ""));
    legend.stroke(
        blind_colour, 3.0,
        path.blind_s > 0.0
            ? fmt::format("blind (below {:g} Hz, or without flux) for {:.3g} s; longest {:.3g} s, from {:.3g} s on",
                          path.blind_below_Hz, path.blind_s, path.longest_blind_s, path.longest_from_s)
            : fmt::format("blind (below {:g} Hz, or without flux): never", path.blind_below_Hz));
  } else {
    body += plot.frequency_lines(map.lines);
  }
  legend.frequency(map.lines);
  if (std::any_of(map.smallest.begin(), map.smallest.end(), [](double value) { return !std::isfinite(value); }))
    legend.field(beyond_fill, std::string(beyond_words));
  body += plot.axes();
  if (!scale.empty()) body += colour_bar(scale, "smallest singular value, per unit; darkest: this or less");
  return svg::document(width, legend.end() + 4, map.title, body + legend.body());
}

std::string map_figure(const EstimatorMap& map) {
  const PlanePlot plot(map.plane);
  std::vector<double> decay;  // 1/s, of stable points
  using State = EstimatorPoint::State;
  const auto any = [&](State state) {
    return std::any_of(map.points.begin(), map.points.end(), [&](const EstimatorPoint& p) { return p.state == state; });
  };
  for (const EstimatorPoint& p : map.points) {
    if (p.state == State::stable) decay.push_back(-p.slowest_per_s);
  }
  const double least = darkest(decay);
  for (double& value : decay) value = std::max(value, least);
  const Scale scale(decay, bottom, top);
  std::string body =
      head(map.title, fmt::format("Error of {} ({}): its slowest pole; {}", map.name, map.kind, map.flux_text));
  body += plot.cells(map.points.size(), [&](std::size_t n) {
    const EstimatorPoint& p = map.points[n];
    if (p.state != State::stable) return std::string(fill_of(p.state));
    return heat(darkness(scale, std::max(-p.slowest_per_s, least)));
  });
  body += plot.frequency_lines(map.lines) + plot.axes();
  if (!scale.empty()) body += colour_bar(scale, "decay of the slowest pole, 1/s; darkest: this or less");
  Legend legend;
  if (any(State::unstable)) legend.field(unstable_fill, "unstable: an error grows");
  if (any(State::marginal)) legend.field(marginal_fill, "marginal: an error neither grows nor dies within 10 s");
  if (any(State::unsettled)) legend.field(unsettled_fill, "no steady estimate found");
  if (any(State::beyond)) legend.field(beyond_fill, std::string(beyond_words));
  legend.frequency(map.lines);
  return svg::document(width, legend.end() + 4, map.title, body + legend.body());
}

}  // namespace slipbench
