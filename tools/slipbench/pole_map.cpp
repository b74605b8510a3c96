#include "tools/slipbench/pole_map.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "tools/slipbench/svg.hpp"

namespace slipbench {

namespace {

using linear::Complex;

constexpr double pi = 3.14159265358979323846, much = 30.0;
constexpr std::string_view wash = "#fbeeea", moved = "#0072B2", not_both = "#D55E00";

// From a point of the plane to px: about the origin, straight or by decades in the radius.
struct Plane {
  double origin_x = 0.0, origin_y = 0.0, reach_px = 1.0, reach = 1.0, least = 0.0;  // least > 0: decades from there on
  [[nodiscard]] double radius(double magnitude) const {
    if (least <= 0.0) return reach_px * magnitude / reach;
    if (magnitude <= least) return reach_px * 0.12 * magnitude / least;  // near the origin: straight
    return reach_px * (0.12 + 0.88 * std::log(magnitude / least) / std::log(reach / least));
  }
  [[nodiscard]] std::pair<double, double> at(Complex s) const {
    const double magnitude = std::abs(s), r = magnitude > 0.0 ? radius(magnitude) / magnitude : 0.0;
    return {origin_x + r * s.real(), origin_y - r * s.imag()};
  }
};

std::string cross(double x, double y, std::string_view stroke) {
  return svg::line(x - 5, y - 5, x + 5, y + 5, stroke, 2.2) + svg::line(x - 5, y + 5, x + 5, y - 5, stroke, 2.2);
}

std::string ring(double x, double y, double radius, std::string_view stroke, double width) {
  return fmt::format("<circle cx=\"{}\" cy=\"{}\" r=\"{}\" fill=\"none\" stroke=\"{}\" stroke-width=\"{}\"/>\n",
                     svg::px(x), svg::px(y), svg::px(radius), stroke, svg::px(width));
}

std::string path(const std::vector<std::pair<double, double>>& points, std::string_view stroke) {
  std::string d;
  for (const auto& [x, y] : points) d += (d.empty() ? "M" : "L") + svg::px(x) + "," + svg::px(y);
  return fmt::format("<path d=\"{}\" fill=\"none\" stroke=\"{}\" stroke-width=\"1\"/>\n", d, stroke);
}

std::string small(double x, double y, const std::string& words, std::string_view anchor = "start") {
  return svg::text(x, y, words, {9, anchor, svg::soft_ink});
}

std::string s_grid(const PoleMap& map, const Plane& plane) {
  std::string out = svg::rectangle(plane.origin_x, map.top, map.left + map.side - plane.origin_x, map.side, wash);
  std::vector<double> circles;
  if (plane.least > 0.0) {
    for (double p = std::ceil(std::log10(plane.least)); p <= std::log10(plane.reach) + 1e-9; p += 1.0)
      circles.push_back(std::pow(10.0, p));
  } else {
    for (const double r : svg::ticks(0.0, plane.reach, 4).values) {
      if (r > 0.0) circles.push_back(r);
    }
  }
  for (const double r : circles) {
    out += ring(plane.origin_x, plane.origin_y, plane.radius(r), svg::grid, 1.0);
    out += small(plane.origin_x + 3, plane.origin_y - plane.radius(r) - 2, fmt::format("{:.3g}", r));
  }
  const double far = 2.0 * map.side;
  for (const double d : {0.1, 0.3, 0.5, 0.7, 0.9}) {
    const double x = -d, y = std::sqrt(1.0 - d * d);
    for (const double sign : {1.0, -1.0})
      out += svg::line(plane.origin_x, plane.origin_y, plane.origin_x + far * x, plane.origin_y + sign * far * y,
                       svg::grid);
    const double reach = std::min(0.86 * plane.reach_px, (map.side / 2 - 14) / y);
    out += small(plane.origin_x + reach * x, plane.origin_y - reach * y, fmt::format("{:g}", d), "end");
  }
  out += svg::line(map.left, plane.origin_y, map.left + map.side, plane.origin_y, svg::frame);
  return out + svg::line(plane.origin_x, map.top, plane.origin_x, map.top + map.side, svg::frame, 1.4);
}

std::string z_grid(const PoleMap& map, const Plane& plane) {
  std::string out = svg::rectangle(map.left, map.top, map.side, map.side, wash);
  out += svg::circle(plane.origin_x, plane.origin_y, plane.radius(1.0), "#ffffff");
  for (const double d : {0.1, 0.3, 0.5, 0.7, 0.9}) {
    std::vector<std::pair<double, double>> up, down;
    for (int i = 0; i <= 60; ++i) {
      const double angle = pi * i / 60.0, r = std::exp(-angle * d / std::sqrt(1.0 - d * d));
      up.push_back(plane.at(std::polar(r, angle))), down.push_back(plane.at(std::polar(r, -angle)));
    }
    out += path(up, svg::grid) + path(down, svg::grid);
    out += small(up[26].first, up[26].second, fmt::format("{:g}", d));
  }
  for (int i = 1; i <= 5; ++i) {  // of the sampling frequency: 0.1 ... 0.5
    const double angle = 2.0 * pi * 0.1 * i;
    for (const double sign : {1.0, -1.0}) {
      const auto [x, y] = plane.at(std::polar(1.0, sign * angle));
      out += svg::line(plane.origin_x, plane.origin_y, x, y, svg::grid);
    }
    const auto [x, y] = plane.at(std::polar(1.06, angle));
    out += small(x, y + 3, fmt::format("{:.3g} Hz", 0.1 * i / map.sample_period_s), i < 3 ? "start" : "end");
  }
  out += svg::line(map.left, plane.origin_y, map.left + map.side, plane.origin_y, svg::frame);
  out += svg::line(plane.origin_x, map.top, plane.origin_x, map.top + map.side, svg::frame);
  return out + ring(plane.origin_x, plane.origin_y, plane.radius(1.0), svg::frame, 1.6);
}

Plane plane_of(const PoleMap& map) {
  double largest = 0.0, least = std::numeric_limits<double>::infinity(), right = 0.0, high = 0.0;
  const auto take = [&](Complex s) {
    const double m = std::abs(s);
    largest = std::max(largest, m), high = std::max(high, std::fabs(s.imag()));
    if (m > 0.0) least = std::min(least, m), right = std::max(right, s.real() / m);
  };
  for (const MappedPole& pole : map.poles) take(pole.at);
  for (const Complex& zero : map.zeros) take(zero);
  Plane plane;
  const bool discrete = map.sample_period_s > 0.0;
  plane.reach = discrete ? std::max(1.25, 1.1 * largest) : largest > 0.0 ? 1.25 * largest : 1.0;
  if (!discrete && largest > much * least) {
    plane.least = std::pow(10.0, std::floor(std::log10(least) - 0.05));
    plane.reach = 2.5 * largest;
  }
  // The left half fills the square unless something stands right of the axis.
  const double share = discrete || right > 0.3 ? 0.5 : 0.2;
  plane.origin_x = map.left + map.side * (1.0 - share), plane.origin_y = map.top + map.side / 2;
  plane.reach_px = share == 0.5 || (high > 0.5 * largest) ? map.side / 2 : map.side * (1.0 - share);
  return plane;
}

}  // namespace

std::string pole_map(const PoleMap& map) {
  const Plane plane = plane_of(map);
  const bool discrete = map.sample_period_s > 0.0;
  std::string out = svg::text(map.left, map.top - 9, discrete ? "poles and zeros, z-plane" : "poles and zeros, rad/s",
                              {12, "start", svg::ink, true});
  out += fmt::format("<clipPath id=\"poles\"><rect x=\"{0}\" y=\"{1}\" width=\"{2}\" height=\"{2}\"/></clipPath>\n",
                     svg::px(map.left), svg::px(map.top), svg::px(map.side));
  out += "<g clip-path=\"url(#poles)\">\n" + (discrete ? z_grid(map, plane) : s_grid(map, plane));
  for (const Complex& zero : map.zeros) {
    const auto [x, y] = plane.at(zero);
    out += ring(x, y, 5.0, "#009E73", 2.0);
  }
  bool hidden = false;
  for (const MappedPole& pole : map.poles) {
    const auto [x, y] = plane.at(pole.at);
    const bool both = pole.controllable && pole.observable;
    hidden = hidden || !both;
    out += cross(x, y, both ? moved : not_both);
  }
  out += "</g>\n";
  out += fmt::format("<rect x=\"{0}\" y=\"{1}\" width=\"{2}\" height=\"{2}\" fill=\"none\" stroke=\"{3}\"/>\n",
                     svg::px(map.left), svg::px(map.top), svg::px(map.side), svg::frame);
  double at = map.left + 6, below = map.top + map.side + 16;
  const auto entry = [&](const std::string& sign, const std::string& words) {
    out += sign + svg::text(at + 10, below, words, {11, "start", svg::soft_ink});
    at += 26 + svg::width_px(words, 11);
  };
  entry(cross(at, below - 4, moved), "pole");
  if (hidden) entry(cross(at, below - 4, not_both), "not moved, or not seen");
  if (!map.zeros.empty()) entry(ring(at, below - 4, 5.0, "#009E73", 2.0), "zero");
  std::string note = discrete ? "spirals: damping; rays: frequency" : "rays: damping; circles: |s| in rad/s";
  if (plane.least > 0.0) note += ", by decades";
  return out + svg::text(map.left, below + 17, note, {10, "start", svg::soft_ink});
}

}  // namespace slipbench
