#include "tools/slipbench/run_figure.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "sim/scenario/scenario.hpp"
#include "tools/slipbench/svg.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

constexpr double width = 960, height = 600, left = 76, right = 936, speed_top = 104, speed_bottom = 352,
                 error_top = 396, error_bottom = 546, legend_row = 18;
constexpr std::size_t byte_budget = 150000, bytes_a_point = 11;

struct Range {
  double low = 0.0, high = 0.0;
  void take(const Envelope& signal) {
    for (const auto& bin : signal.bins()) {
      if (!bin.empty()) low = std::min(low, bin.low), high = std::max(high, bin.high);
    }
  }
  void widen() {  // room above and below, and never no height
    const double room = std::max(0.06 * (high - low), 1e-3);
    low -= room, high += room;
  }
};

// A panel's px rectangle and the values at its lower and upper edge.
struct Plane {
  double low, high, top, bottom;
  [[nodiscard]] std::string y(double value) const {  // far off the panel is as good as just off it
    return svg::px(std::clamp(svg::Axis{low, high, bottom, top}.at(value), top - 400.0, bottom + 400.0));
  }
  [[nodiscard]] static std::string x(std::size_t column, const Envelope& signal) {
    return svg::px(left +
                   (right - left) * (static_cast<double>(column) + 0.5) / static_cast<double>(signal.bins().size()));
  }
};

// Calls f(first, last) for each stretch of columns without a gap.
template <class F>
void each_stretch(const Envelope& signal, F&& f) {
  const auto& bins = signal.bins();
  for (std::size_t i = 0, first = 0; i <= bins.size(); ++i) {
    if (i < bins.size() && !bins[i].empty()) continue;
    if (i > first) f(first, i);
    first = i + 1;
  }
}

std::string mean_line(const Envelope& signal, const Plane& plane) {
  std::string points;
  each_stretch(signal, [&](std::size_t first, std::size_t end) {
    for (std::size_t i = first; i < end; ++i) {
      points += (i == first ? "M" : "L") + Plane::x(i, signal) + "," + plane.y(signal.bins()[i].mean());
    }
  });
  return points;
}

std::string band(const Envelope& signal, const Plane& plane, std::string_view fill) {
  std::string points;
  each_stretch(signal, [&](std::size_t first, std::size_t end) {
    for (std::size_t i = first; i < end; ++i)
      points += (i == first ? "M" : "L") + Plane::x(i, signal) + "," + plane.y(signal.bins()[i].high);
    for (std::size_t i = end; i-- > first;) points += "L" + Plane::x(i, signal) + "," + plane.y(signal.bins()[i].low);
    points += "Z";
  });
  if (points.empty()) return "";
  return fmt::format("<path d=\"{}\" fill=\"{}\" fill-opacity=\"0.22\"/>\n", points, fill);
}

std::string path(const std::string& points, std::string_view stroke, double stroke_width, std::string_view dashes) {
  if (points.empty()) return "";
  return fmt::format("<path d=\"{}\" fill=\"none\" stroke=\"{}\" stroke-width=\"{}\" stroke-linejoin=\"round\"{}/>\n",
                     points, stroke, stroke_width,
                     dashes.empty() ? "" : fmt::format(" stroke-dasharray=\"{}\"", dashes));
}

std::string panel(const svg::Axis& x, const svg::Axis& y, const svg::Ticks& x_ticks, std::string_view name,
                  bool x_labels) {
  std::string out;
  const svg::Ticks y_ticks = svg::ticks(y.low, y.high, 5);
  for (const double t : x_ticks.values) out += svg::line(x.at(t), y.from_px, x.at(t), y.to_px, svg::grid);
  for (const double v : y_ticks.values) {
    const bool zero = std::fabs(v) < 1e-9 * y_ticks.step;
    out += svg::line(x.from_px, y.at(v), x.to_px, y.at(v), zero ? svg::frame : svg::grid);
    out += svg::text(x.from_px - 8, y.at(v) + 4, y_ticks.label(v), {11, "end", svg::soft_ink});
  }
  if (x_labels) {
    for (const double t : x_ticks.values)
      out += svg::text(x.at(t), y.from_px + 18, x_ticks.label(t), {11, "middle", svg::soft_ink});
    out += svg::text((x.from_px + x.to_px) / 2, y.from_px + 38, "time, s", {12, "middle"});
  }
  return out + svg::text(x.from_px, y.to_px - 9, name, {12, "start", svg::ink, true});
}

// Load steps and events as thin lines. Their names stand between the panels, where they hide nothing: in the first of two
// rows with room, or not at all.
std::string marks(const svg::Axis& x, const std::vector<double>& load_steps, const std::vector<ActedEvent>& events) {
  std::vector<std::pair<double, std::string>> all;
  for (const double step : load_steps) {
    if (step >= 0.0 && step <= x.high) all.emplace_back(step, "load step");
  }
  for (const ActedEvent& event : events) all.emplace_back(event.time_s, event.what);
  std::stable_sort(all.begin(), all.end(), [](const auto& a, const auto& b) { return a.first < b.first; });
  std::string out;
  std::array<double, 2> free_from{left, left};
  for (const auto& [time, name] : all) {
    const double at = x.at(time), wide = svg::width_px(name, 11) + 12.0;
    out += svg::line(at, speed_top, at, error_bottom, svg::soft_ink, 1.0, "1 3");
    const double from = std::min(at, right - wide);  // moved left where it would run off
    for (std::size_t row = 0; row < free_from.size(); ++row) {
      if (from < free_from[row]) continue;
      out += svg::text(from + 4, speed_bottom + 14 + 11 * static_cast<double>(row), name, {11, "start", svg::soft_ink});
      free_from[row] = from + wide;
      break;
    }
  }
  return out;
}

}  // namespace

void RunFigure::begin(const RunInfo& info) {
  info_ = info;
  const std::size_t points =
      2 + 4 * info.estimator_names.size();  // a column: truth, reference; estimate, error, its band
  const auto ticks = static_cast<std::size_t>(info.duration_s / info.control_period_s) + 1;
  const std::size_t columns = std::min(ticks, std::clamp(byte_budget / (points * bytes_a_point), std::size_t{100},
                                                         static_cast<std::size_t>(right - left)));
  truth_ = reference_ = Envelope(columns);
  estimates_.assign(info.estimator_names.size(), Envelope(columns));
  errors_ = estimates_;
  window_error_.assign(info.estimator_names.size(), {0.0, 0.0});
}

void RunFigure::control_tick(const TickView& view) {
  const std::size_t columns = truth_.bins().size();
  const auto column =
      std::min(columns - 1, static_cast<std::size_t>(view.time_s / info_.duration_s * static_cast<double>(columns)));
  const double speed = (*view.plant)[P::speed_rpm];
  truth_.add(column, speed);
  reference_.add(column, (*view.plant)[P::speed_reference_rpm]);
  const bool scored = window_.holds(view.time_s, info_.control_period_s);
  for (std::size_t i = 0; i < estimates_.size() && i < view.estimates.size(); ++i) {
    const double estimate = view.estimates[i].speed * (30.0 / 3.14159265358979323846);
    estimates_[i].add(column, estimate);
    errors_[i].add(column, estimate - speed);
    if (!scored) continue;
    auto& [least, greatest] = window_error_[i];
    if (estimate - speed < least) least = estimate - speed;
    if (estimate - speed > greatest) greatest = estimate - speed;
  }
}

std::string RunFigure::svg(const Scenario& scenario, const std::vector<EstimatorFigures>& figures,
                           const std::string& ended, const std::vector<ActedEvent>& events) const {
  Range speed, error;
  speed.take(truth_);
  speed.take(reference_);
  // The scale of the errors is set by the scored ones of estimators that kept lock, so that a lost one hides no other.
  for (std::size_t i = 0; i < errors_.size(); ++i) {
    if (i < figures.size() && figures[i].lost_at_s) continue;
    error.low = std::min(error.low, window_error_[i][0]), error.high = std::max(error.high, window_error_[i][1]);
  }
  if (!(error.high > error.low)) {
    for (const Envelope& e : errors_) error.take(e);
  }
  error.widen();
  const double room = 0.5 * (speed.high - speed.low) + 1.0;  // a lost estimate may not flatten the true speed
  for (const Envelope& e : estimates_) {
    Range its;
    its.take(e);
    speed.low = std::max(std::min(speed.low, its.low), speed.low - room);
    speed.high = std::min(std::max(speed.high, its.high), speed.high + room);
  }
  speed.widen();

  const svg::Axis x{0.0, info_.duration_s, left, right};
  const svg::Ticks x_ticks = svg::ticks(0.0, info_.duration_s, 10);
  const std::string title = scenario.title.empty() ? "Run" : scenario.title;
  std::string head = svg::text(left, 32, svg::fitted(title, right - left, 17, true), {17, "start", svg::ink, true}),
              body;
  head += svg::text(left, 52,
                    fmt::format("seed {}, scored from {} s to {} s{}", scenario.seed, plain(window_.from_s),
                                plain(window_.to_s), ended.empty() ? "" : "; " + ended),
                    {12, "start", svg::soft_ink});
  for (const double top : {speed_top, error_top}) {  // what is not scored lies under a grey wash
    const double bottom = top == speed_top ? speed_bottom : error_bottom;
    const double from = x.at(std::clamp(window_.from_s, 0.0, info_.duration_s)),
                 to = x.at(std::clamp(window_.to_s, 0.0, info_.duration_s));
    if (from > left + 0.5) body += svg::rectangle(left, top, from - left, bottom - top, "#f3f3f3");
    if (to < right - 0.5) body += svg::rectangle(to, top, right - to, bottom - top, "#f3f3f3");
  }
  body += panel(x, {speed.low, speed.high, speed_bottom, speed_top}, x_ticks, "speed, rpm", false);
  body += panel(x, {error.low, error.high, error_bottom, error_top}, x_ticks, "estimated minus true speed, rpm", true);
  body += fmt::format(
      "<clipPath id=\"a\"><rect x=\"{0}\" y=\"{2}\" width=\"{1}\" height=\"{3}\"/></clipPath>\n"
      "<clipPath id=\"b\"><rect x=\"{0}\" y=\"{4}\" width=\"{1}\" height=\"{5}\"/></clipPath>\n",
      left, right - left, speed_top, speed_bottom - speed_top, error_top, error_bottom - error_top);
  const Plane speed_plane{speed.low, speed.high, speed_top, speed_bottom},
      error_plane{error.low, error.high, error_top, error_bottom};
  const std::string reference = mean_line(reference_, speed_plane);
  body += marks(x, load_steps_s_, events);
  body += "<g clip-path=\"url(#a)\">\n" + path(mean_line(truth_, speed_plane), svg::ink, 3.4, "") +
          path(reference, "#c8c8c8", 1.6, "5 3");
  for (std::size_t i = 0; i < estimates_.size(); ++i) {
    body += path(mean_line(estimates_[i], speed_plane), svg::colour(i), 1.2, svg::dash(i));
  }
  body += "</g>\n<g clip-path=\"url(#b)\">\n";
  for (std::size_t i = 0; i < errors_.size(); ++i) body += band(errors_[i], error_plane, svg::colour(i));
  for (std::size_t i = 0; i < errors_.size(); ++i)
    body += path(mean_line(errors_[i], error_plane), svg::colour(i), 1.4, svg::dash(i));
  body += "</g>\n";

  double at = left, row = 72.0;  // the legend takes as many rows as it needs, and what follows moves down
  const auto legend = [&](std::string_view name, std::string_view stroke, double stroke_width,
                          std::string_view dashes) {
    const double wide = 32.0 + svg::width_px(name, 12);
    if (at > left && at + wide > right) at = left, row += legend_row;
    head += svg::line(at, row, at + 26, row, stroke, stroke_width, dashes) + svg::text(at + 32, row + 4, name, {12});
    at += wide + 22;
  };
  legend("true", svg::ink, 3.4, "");
  if (!reference.empty()) legend("reference", "#b4b4b4", 1.6, "5 3");
  for (std::size_t i = 0; i < errors_.size(); ++i) {
    legend(info_.estimator_names[i], svg::colour(i), 2.4, svg::dash(i));
    if (i >= figures.size() || !figures[i].lost_at_s) continue;
    const double lost = x.at(*figures[i].lost_at_s);
    const bool late = lost > 0.6 * right;  // no room to its right
    body += svg::line(lost, error_top, lost, error_bottom, svg::colour(i), 1.2, "3 2");
    body += svg::text(lost + (late ? -4 : 4), error_top + 14 + 13 * static_cast<double>(i % 6),
                      svg::fitted(info_.estimator_names[i], 300, 11) + " lost",
                      {11, late ? "end" : "start", svg::colour(i)});
  }
  Range whole;
  for (const Envelope& e : errors_) whole.take(e);
  if (whole.low < error.low || whole.high > error.high) {
    body += svg::text(right, error_top - 9, "larger errors run off the scale", {11, "end", svg::soft_ink});
  }
  const double down = row - 72.0;
  if (down > 0.0) body = fmt::format("<g transform=\"translate(0,{})\">\n{}</g>\n", svg::px(down), body);
  return svg::document(width, height + down, scenario.title.empty() ? "slipbench run" : scenario.title, head + body);
}

}  // namespace slipbench
