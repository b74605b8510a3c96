#include "tools/slipbench/chart.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace slipbench {

namespace {

struct Span {
  double low = std::numeric_limits<double>::infinity(), high = -low;
  void take(double x) {
    if (std::isfinite(x)) low = std::min(low, x), high = std::max(high, x);
  }
  [[nodiscard]] bool any() const { return low <= high; }
};

std::string points_of(const ChartLine& line, const svg::Axis& x, const svg::Axis& y, bool decades) {
  std::string points;
  bool down = false;
  double before = 0.0;
  const double far = 4000.0;  // px beyond which a line only runs off
  for (std::size_t i = 0; i < line.x.size() && i < line.y.size(); ++i) {
    if (!std::isfinite(line.y[i]) || !std::isfinite(line.x[i])) {
      down = false;
      continue;
    }
    const double px = x.at(decades ? std::log10(line.x[i]) : line.x[i]), py = std::clamp(y.at(line.y[i]), -far, far);
    if (down && line.stairs) points += "L" + svg::px(px) + "," + svg::px(before);
    points += (down ? "L" : "M") + svg::px(px) + "," + svg::px(py);
    before = py, down = true;
  }
  return points;
}

// Marks by decades: all of 1, 2, 5 where they are few, else tens.
std::vector<double> decade_ticks(double low, double high, double room_px) {
  std::vector<double> ticks;
  const bool fine = high - low < 2.2;
  const int step = std::max(1, static_cast<int>(std::ceil((high - low) * 52.0 / room_px)));
  for (double p = std::floor(low); p <= high; p += step) {
    for (const double lead : {1.0, 2.0, 5.0}) {
      const double at = p + std::log10(lead);
      if ((lead == 1.0 || fine) && at >= low - 1e-9 && at <= high + 1e-9) ticks.push_back(at);
    }
  }
  return ticks;
}

}  // namespace

std::string chart(const Chart& c, const std::string& id) {
  Span xs, ys;
  for (const ChartLine& line : c.lines) {
    for (const double v : line.x)
      xs.take(c.decades ? (v > 0.0 ? std::log10(v) : std::numeric_limits<double>::quiet_NaN()) : v);
    for (const double v : line.y) ys.take(v);
  }
  const double right = c.left + c.width, bottom = c.top + c.height;
  std::string out =
      svg::text(c.left, c.top - 9, svg::fitted(c.heading, c.width, 12, true), {12, "start", svg::ink, true});
  if (!xs.any() || !ys.any())
    return out + svg::text(c.left, c.top + 20, "nothing to draw", {11, "start", svg::soft_ink});
  if (c.x_high > c.x_low) xs.low = c.x_low, xs.high = c.x_high;
  if (!(xs.high > xs.low)) xs.low -= 0.5, xs.high += 0.5;
  if (c.high > c.low) {
    ys.low = c.low, ys.high = c.high;
  } else {
    const double room = std::max(0.06 * (ys.high - ys.low), 1e-9 * std::max(std::fabs(ys.high), std::fabs(ys.low)));
    ys.low -= room > 0.0 ? room : 0.5, ys.high += room > 0.0 ? room : 0.5;
  }
  const svg::Axis x{xs.low, xs.high, c.left, right}, y{ys.low, ys.high, bottom, c.top};
  if (c.decades) {
    for (const double t : decade_ticks(xs.low, xs.high, c.width)) {
      out += svg::line(x.at(t), c.top, x.at(t), bottom, svg::grid);
      out += svg::text(x.at(t), bottom + 16, fmt::format("{:.5g}", std::pow(10.0, t)), {11, "middle", svg::soft_ink});
    }
  } else {
    const svg::Ticks ticks = svg::ticks(xs.low, xs.high, static_cast<int>(c.width / 70.0));
    for (const double t : ticks.values) {
      out += svg::line(x.at(t), c.top, x.at(t), bottom, svg::grid);
      out += svg::text(x.at(t), bottom + 16, ticks.label(t), {11, "middle", svg::soft_ink});
    }
  }
  svg::Ticks rows = svg::ticks(ys.low, ys.high, std::max(2, static_cast<int>(c.height / 34.0)));
  if (c.y_step > 0.0) {
    rows = {};
    rows.step = c.y_step;
    for (double v = std::ceil(ys.low / c.y_step) * c.y_step; v <= ys.high + 1e-9; v += c.y_step)
      rows.values.push_back(v);
  }
  if (rows.values.size() < 2) rows = svg::ticks(ys.low, ys.high, 3);
  for (const double v : rows.values) {
    const bool zero = std::fabs(v) < 1e-9 * rows.step;
    out += svg::line(c.left, y.at(v), right, y.at(v), zero ? svg::frame : svg::grid);
    out += svg::text(c.left - 6, y.at(v) + 4, rows.label(v), {11, "end", svg::soft_ink});
  }
  if (!c.x_label.empty()) out += svg::text((c.left + right) / 2, bottom + 33, c.x_label, {12, "middle"});
  out += fmt::format("<clipPath id=\"{}\"><rect x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\"/></clipPath>\n", id,
                     svg::px(c.left), svg::px(c.top), svg::px(c.width), svg::px(c.height));
  for (const ChartMark& mark : c.marks) {
    const double at = mark.upright ? x.at(c.decades ? std::log10(mark.at) : mark.at) : y.at(mark.at);
    const double low = mark.upright ? c.left : c.top, high = mark.upright ? right : bottom;
    if (!(at >= low && at <= high)) continue;
    out += mark.upright ? svg::line(at, c.top, at, bottom, svg::soft_ink, 1.0, "3 3")
                        : svg::line(c.left, at, right, at, svg::soft_ink, 1.0, "3 3");
    const bool late = mark.upright && at > right - svg::width_px(mark.name, 10) - 6;
    out += mark.upright
               ? svg::text(at + (late ? -3 : 3), c.top + 11, mark.name, {10, late ? "end" : "start", svg::soft_ink})
               : svg::text(right - 3, at - 3, mark.name, {10, "end", svg::soft_ink});
  }
  out += fmt::format("<g clip-path=\"url(#{})\">\n", id);
  for (const ChartLine& line : c.lines) {
    const std::string points = points_of(line, x, y, c.decades);
    if (points.empty()) continue;
    out += fmt::format("<path d=\"{}\" fill=\"none\" stroke=\"{}\" stroke-width=\"{}\" stroke-linejoin=\"round\"{}/>\n",
                       points, line.stroke, svg::px(line.width),
                       line.dashes.empty() ? "" : fmt::format(" stroke-dasharray=\"{}\"", line.dashes));
  }
  return out + "</g>\n" +
         fmt::format("<rect x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\" fill=\"none\" stroke=\"{}\"/>\n",
                     svg::px(c.left), svg::px(c.top), svg::px(c.width), svg::px(c.height), svg::frame);
}

std::string legend(const std::vector<LegendEntry>& entries, double left, double right, double top, double& bottom) {
  std::string out;
  double at = left;
  bottom = top;
  for (const LegendEntry& entry : entries) {
    const double wide = 32.0 + svg::width_px(entry.name, 12);
    if (at > left && at + wide > right) at = left, bottom += 18.0;
    out += svg::line(at, bottom - 4, at + 26, bottom - 4, entry.stroke, 2.4, entry.dashes);
    out += svg::text(at + 32, bottom, svg::fitted(entry.name, right - at - 32, 12), {12});
    at += wide + 20;
  }
  return out;
}

}  // namespace slipbench
