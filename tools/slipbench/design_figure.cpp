// The loops of a design in one picture: output, effort, what a disturbance does, gain over frequency.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "plant/linear/frequency_response.hpp"
#include "plant/linear/response.hpp"
#include "tools/slipbench/chart.hpp"
#include "tools/slipbench/design_result.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

constexpr double two_pi = 6.283185307179586, left = 70, wide = 400, gap = 80, top = 116, high = 190, row_gap = 70,
                 right = left + 2 * wide + gap;
constexpr Eigen::Index drawn_points = 1000;

std::string_view dash_of(const Loop& loop) {
  return loop.name == "open loop" ? "2 3" : loop.name == "with observer" ? "7 4" : "";
}

// The time that shows every stable loop settle; what is not stable runs off.
double duration_of(const DesignResult& r) {
  double longest = 0.0, any = 0.0;
  for (std::size_t i = 0; i < r.loops.size(); ++i) {
    const double one = grid_for(r.loops[i].system).duration_s();
    any = std::max(any, one);
    if (!r.loops[i].stable || r.loops[i].name == "open loop") continue;
    double settled = one;
    for (const LoopRow& row : r.rows) {
      if (row.loop == i && row.step && row.step->settling_s > 0.0) settled = std::min(one, 2.5 * row.step->settling_s);
    }
    longest = std::max(longest, settled);
  }
  return longest > 0.0 ? longest : any;
}

ChartLine line_of(const linear::Response& r, Eigen::Index output, std::size_t loop, std::string_view dashes,
                  bool stairs) {
  ChartLine line;
  line.stroke = svg::colour(loop), line.dashes = dashes, line.stairs = stairs;
  const auto steps = static_cast<Eigen::Index>(r.time_s.size());
  const Eigen::Index stride = std::max<Eigen::Index>(1, steps / drawn_points);
  for (Eigen::Index i = 0; i < steps; i += stride) {
    line.x.push_back(r.time_s[static_cast<std::size_t>(i)]);
    line.y.push_back(r.y(i, output));
  }
  return line;
}

struct Panels {
  Chart output, effort, pushed, gain;
};

// A loop that grows may not flatten the others: the scale is set by the stable ones.
void scale(Chart& c, const std::vector<bool>& counts) {
  double low = 0.0, up = 0.0;
  for (std::size_t i = 0; i < c.lines.size(); ++i) {
    if (i < counts.size() && !counts[i]) continue;
    for (const double y : c.lines[i].y) {
      if (std::isfinite(y)) low = std::min(low, y), up = std::max(up, y);
    }
  }
  if (!(up > low)) return;
  c.low = low - 0.07 * (up - low), c.high = up + 0.07 * (up - low);
}

ChartLine gain_line(const DesignResult& r, const Loop& loop, Eigen::Index input, Eigen::Index output,
                    std::size_t number) {
  ChartLine line;
  line.stroke = svg::colour(number), line.dashes = dash_of(loop);
  const linear::System& widest = r.loops.back().system;  // the same frequencies for all
  for (const double w : frequencies_for(widest, 300)) {
    try {
      const double g = linear::frequency_response(loop.system, w).gain(output, input);
      line.x.push_back(w / two_pi),
          line.y.push_back(g > 0.0 ? 20.0 * std::log10(g) : std::numeric_limits<double>::quiet_NaN());
    } catch (const linear::LinearError&) {  // a pole stands there
    }
  }
  return line;
}

Panels panels_of(const DesignResult& r) {
  Panels p;
  const double duration = duration_of(r);
  std::vector<bool> stable;
  for (std::size_t i = 0; i < r.loops.size(); ++i) {
    const Loop& loop = r.loops[i];
    const LoopPort port = port_of(r, loop, 0);
    const TimeGrid grid = grid_for(loop.system, duration);
    const double step_s = loop.system.discrete() ? 0.0 : grid.step_s;
    const bool stairs = loop.system.discrete();
    const auto answer = linear::step_response(loop.system, port.input, step_s, grid.steps);
    p.output.lines.push_back(line_of(answer, port.output, i, dash_of(loop), stairs));
    const Eigen::Index effort = loop.system.outputs() - r.plant.inputs();
    p.effort.lines.push_back(line_of(answer, effort, i, dash_of(loop), stairs));
    p.gain.lines.push_back(gain_line(r, loop, port.input, port.output, i));
    stable.push_back(loop.stable && (r.pi || loop.name != "open loop"));
    if (r.pi) continue;
    const auto pushed = linear::step_response(loop.system, loop.references, step_s, grid.steps);
    p.pushed.lines.push_back(line_of(pushed, port.output, i, dash_of(loop), stairs));
  }
  scale(p.output, stable), scale(p.effort, stable), scale(p.pushed, stable);
  return p;
}

}  // namespace

std::string design_figure(const DesignResult& r) {
  const std::string title = r.title.empty() ? "Design" : r.title;
  std::string body = svg::text(left, 32, svg::fitted(title, right - left, 17, true), {17, "start", svg::ink, true});
  if (r.loops.empty() || r.rows.empty()) {
    body += svg::text(left, 60, "no loop to draw: " + (r.notes.empty() ? "no reference" : r.notes.front()), {12});
    return svg::document(right + 30, 120, title, body);
  }
  const std::string output = r.pi ? r.plant.output_name(0) : r.plant.output_name(r.tracked.front());
  const std::string input = r.plant.input_name(0);
  body += svg::text(left, 52,
                    svg::fitted(fmt::format("{}; {} to one unit of its reference{}{}", name_of(r.kind), output,
                                            r.pi ? "" : " (open loop, feedback alone: of " + input + ")",
                                            r.tracked.size() > 1 ? "; the other outputs stand in the report" : ""),
                                right - left, 12),
                    {12, "start", svg::soft_ink});
  std::vector<LegendEntry> entries;
  for (std::size_t i = 0; i < r.loops.size(); ++i)
    entries.push_back(
        {r.loops[i].name + (r.loops[i].stable ? "" : " (not stable)"), svg::colour(i), dash_of(r.loops[i])});
  double below = 76;
  body += legend(entries, left, right, 76, below);
  const double down = below - 76;
  Panels p = panels_of(r);
  const auto place = [&](Chart& c, int column, int row, const std::string& heading, const std::string& x_label) {
    c.left = left + column * (wide + gap), c.top = top + down + row * (high + row_gap), c.width = wide, c.height = high;
    c.heading = heading, c.x_label = x_label;
  };
  place(p.output, 0, 0, output, "time, s");
  place(p.effort, 1, 0, "effort, " + input, "time, s");
  p.output.marks.push_back({1.0, false, "reference"});
  p.gain.decades = true;
  if (r.at_Hz > 0.0) p.gain.marks.push_back({r.at_Hz, true, fmt::format("{} Hz", plain(r.at_Hz, 3))});
  if (r.pi) {
    place(p.gain, 0, 1, "gain from reference to output, dB", "frequency, Hz");
    body += chart(p.output, "a") + chart(p.effort, "b") + chart(p.gain, "d");
  } else {
    place(p.pushed, 0, 1, output + " after a unit disturbance", "time, s");
    place(p.gain, 1, 1, "gain from reference to output, dB", "frequency, Hz");
    body += chart(p.output, "a") + chart(p.effort, "b") + chart(p.pushed, "c") + chart(p.gain, "d");
  }
  return svg::document(right + 30, top + down + 2 * high + row_gap + 52, title, body);
}

}  // namespace slipbench
