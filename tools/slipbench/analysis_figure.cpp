// A linear system in one picture: poles and zeros, step responses, gain and phase over frequency.
#include <fmt/format.h>

#include <cmath>
#include <limits>

#include "plant/linear/response.hpp"
#include "tools/slipbench/analysis.hpp"
#include "tools/slipbench/chart.hpp"
#include "tools/slipbench/pole_map.hpp"
#include "tools/slipbench/table.hpp"
#include "tools/slipbench/time_grid.hpp"

namespace slipbench {

namespace {

constexpr double two_pi = 6.283185307179586, left = 40, map_top = 96, side = 340, charts_left = 450, charts_width = 480,
                 right = charts_left + charts_width;
constexpr std::size_t most_pairs = svg::palette.size();
constexpr Eigen::Index drawn_points = 1200;

struct Pair {
  Eigen::Index input, output;
};

std::vector<Pair> pairs_of(const linear::System& s) {
  std::vector<Pair> pairs;
  for (Eigen::Index j = 0; j < s.inputs(); ++j) {
    for (Eigen::Index i = 0; i < s.outputs(); ++i) pairs.push_back({j, i});
  }
  return pairs;
}

Chart steps_of(const linear::System& s, const std::vector<Pair>& pairs) {
  Chart c;
  c.left = charts_left, c.top = map_top, c.width = charts_width, c.height = 170;
  c.heading = "response to a step of one unit, each output in its own unit";
  c.x_label = "time, s";
  const TimeGrid grid = grid_for(s);
  for (std::size_t k = 0; k < pairs.size(); ++k) {
    const auto r = linear::step_response(s, pairs[k].input, s.discrete() ? 0.0 : grid.step_s, grid.steps);
    ChartLine line;
    line.stroke = svg::colour(k), line.stairs = s.discrete() && grid.steps <= 200;
    const Eigen::Index stride = std::max<Eigen::Index>(1, grid.steps / drawn_points);
    for (Eigen::Index i = 0; i <= grid.steps; i += stride) {
      line.x.push_back(r.time_s[static_cast<std::size_t>(i)]);
      line.y.push_back(r.y(i, pairs[k].output));
    }
    c.lines.push_back(std::move(line));
  }
  return c;
}

// Gain and phase; frequencies at which a pole stands are left out.
void frequency_charts(const linear::System& s, const std::vector<Pair>& pairs, double at_Hz, Chart& gain,
                      Chart& phase) {
  gain.left = phase.left = charts_left, gain.width = phase.width = charts_width;
  gain.top = map_top + 250, gain.height = 150, phase.top = gain.top + 196, phase.height = 120;
  gain.heading = "gain, dB", phase.heading = "phase, degrees", phase.x_label = "frequency, Hz";
  gain.decades = phase.decades = true, phase.y_step = 90.0;
  std::vector<ChartLine> gains(pairs.size()), phases(pairs.size());
  std::vector<double> turns(pairs.size(), 0.0), before(pairs.size(), std::numeric_limits<double>::quiet_NaN());
  for (const double w : frequencies_for(s, 400)) {
    linear::FrequencyPoint point;
    try {
      point = linear::frequency_response(s, w);
    } catch (const linear::LinearError&) {
      continue;
    }
    for (std::size_t k = 0; k < pairs.size(); ++k) {
      const double g = point.gain(pairs[k].output, pairs[k].input);
      double angle = point.phase_rad(pairs[k].output, pairs[k].input) * 360.0 / two_pi;
      if (g > 0.0 && std::isfinite(before[k])) turns[k] -= std::round((angle + turns[k] - before[k]) / 360.0) * 360.0;
      angle += turns[k];
      if (g > 0.0) before[k] = angle;
      gains[k].x.push_back(w / two_pi), phases[k].x.push_back(w / two_pi);
      gains[k].y.push_back(g > 0.0 ? 20.0 * std::log10(g) : std::numeric_limits<double>::quiet_NaN()),
          phases[k].y.push_back(g > 0.0 ? angle : std::numeric_limits<double>::quiet_NaN());
    }
  }
  for (std::size_t k = 0; k < pairs.size(); ++k) {
    gains[k].stroke = phases[k].stroke = svg::colour(k);
    gain.lines.push_back(std::move(gains[k])), phase.lines.push_back(std::move(phases[k]));
  }
  if (at_Hz > 0.0) {
    gain.marks.push_back({at_Hz, true, fmt::format("{} Hz", plain(at_Hz))});
    phase.marks.push_back({at_Hz, true, ""});
  }
}

}  // namespace

std::string analysis_figure(const Analysis& a) {
  const std::string title = a.title.empty() ? "Linear analysis" : a.title;
  std::string body = svg::text(left, 32, svg::fitted(title, right - left, 17, true), {17, "start", svg::ink, true});
  body += svg::text(left, 52,
                    svg::fitted(fmt::format("order {}, minimal order {}; {}: {}", a.system.order(), a.minimal_order(),
                                            linear::name_of(a.verdict.stability), a.verdict.why),
                                right - left, 12),
                    {12, "start", svg::soft_ink});
  PoleMap map;
  map.left = left, map.top = map_top, map.side = side, map.sample_period_s = a.system.sample_period_s;
  for (const linear::ModeTest& test : a.tests) map.poles.push_back({test.pole, test.controllable, test.observable});
  if (a.zeros) map.zeros = *a.zeros;
  body += pole_map(map);
  std::vector<Pair> pairs = pairs_of(a.system);
  const std::size_t all = pairs.size();
  pairs.resize(std::min(all, most_pairs));
  double bottom = map_top + side + 60;
  std::vector<LegendEntry> entries;
  for (std::size_t k = 0; k < pairs.size(); ++k)
    entries.push_back({a.system.input_name(pairs[k].input) + " to " + a.system.output_name(pairs[k].output),
                       svg::colour(k), svg::dash(k)});
  for (const LegendEntry& entry : entries) {
    double line = bottom;
    body += legend({entry}, left, left + side, bottom, line);
    bottom = line + 20;
  }
  if (all > pairs.size())
    body += svg::text(left, bottom, fmt::format("and {} more pairs, not drawn", all - pairs.size()),
                      {11, "start", svg::soft_ink});
  if (!pairs.empty()) {
    Chart gain, phase;
    frequency_charts(a.system, pairs, a.at_Hz, gain, phase);
    body += chart(steps_of(a.system, pairs), "steps") + chart(gain, "gain") + chart(phase, "phase");
  } else {
    body += svg::text(charts_left, map_top + 20, "no inputs or no outputs: no responses", {12, "start", svg::soft_ink});
  }
  return svg::document(right + 30, map_top + 250 + 196 + 120 + 56, title, body);
}

}  // namespace slipbench
