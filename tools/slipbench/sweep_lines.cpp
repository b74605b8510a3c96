// One key: a line an estimator through the medians over noise runs, within the band from 5 to 95 %. Words in place of numbers: dots.
#include <fmt/format.h>

#include <algorithm>

#include "tools/slipbench/scale.hpp"
#include "tools/slipbench/svg.hpp"
#include "tools/slipbench/sweep_figure.hpp"

namespace slipbench {

namespace {

constexpr double width = 860, left = 84, right = 836, top = 116, bottom = 500, legend_row = 18;
constexpr std::size_t most_dots = 60;

struct Plot {
  svg::Axis x;
  Scale y;
  double dodge;  // px between estimators over one word
};

// Calls f(first, last) for each stretch of cases that have the figure.
template <class F>
void each_stretch(const std::vector<Cell>& cells, F&& f) {
  for (std::size_t i = 0, first = 0; i <= cells.size(); ++i) {
    if (i < cells.size() && cells[i].median) continue;
    if (i > first) f(first, i);
    first = i + 1;
  }
}

std::string line_of(const std::vector<Cell>& cells, const std::vector<double>& at, const Plot& plot, std::size_t e) {
  std::string band, line, out;
  const auto point = [&](std::size_t i, double value) {
    return svg::px(plot.x.at(at[i])) + "," + svg::px(plot.y.at(value));
  };
  each_stretch(cells, [&](std::size_t first, std::size_t end) {
    for (std::size_t i = first; i < end; ++i) band += (i == first ? "M" : "L") + point(i, *cells[i].high);
    for (std::size_t i = end; i-- > first;) band += "L" + point(i, *cells[i].low);
    band += "Z";
    for (std::size_t i = first; i < end; ++i) line += (i == first ? "M" : "L") + point(i, *cells[i].median);
  });
  const bool spread =
      std::any_of(cells.begin(), cells.end(), [](const Cell& c) { return c.median && *c.high > *c.low; });
  if (spread) out += fmt::format("<path d=\"{}\" fill=\"{}\" fill-opacity=\"0.22\"/>\n", band, svg::colour(e));
  if (!line.empty())
    out += fmt::format("<path d=\"{}\" fill=\"none\" stroke=\"{}\" stroke-width=\"2\" stroke-linejoin=\"round\"{}/>\n",
                       line, svg::colour(e),
                       svg::dash(e).empty() ? "" : fmt::format(" stroke-dasharray=\"{}\"", svg::dash(e)));
  return out;
}

// A ring where the estimator was lost, else a dot.
std::string dots_of(const std::vector<Cell>& cells, const std::vector<double>& at, const Plot& plot, std::size_t e,
                    bool bars) {
  std::string out;
  for (std::size_t i = 0; i < cells.size(); ++i) {
    if (!cells[i].median) continue;
    const double x = plot.x.at(at[i]) + plot.dodge * static_cast<double>(e);
    if (bars && *cells[i].high > *cells[i].low)
      out += svg::line(x, plot.y.at(*cells[i].low), x, plot.y.at(*cells[i].high), svg::colour(e), 3.0);
    if (cells[i].lost || bars || cells.size() <= most_dots)
      out += svg::circle(x, plot.y.at(*cells[i].median), bars ? 5.0 : 3.6, svg::colour(e));
    if (cells[i].lost) out += svg::circle(x, plot.y.at(*cells[i].median), bars ? 2.8 : 2.0, "#ffffff");
  }
  return out;
}

}  // namespace

std::string sweep_lines(const SweepPicture& p) {
  const GridAxis& axis = p.grid->axes[0];
  const bool words = axis.numbers.empty();
  std::vector<double> at = axis.numbers, values;
  for (std::size_t i = 0; words && i < axis.labels.size(); ++i) at.push_back(static_cast<double>(i) + 0.5);
  bool any_lost = false;
  for (const std::vector<Cell>& cells : p.grid->cells) {
    for (const Cell& cell : cells) {
      if (cell.median) values.insert(values.end(), {*cell.low, *cell.high});
      any_lost = any_lost || cell.lost;
    }
  }
  const double many = static_cast<double>(p.grid->cells.size());
  const double each = (right - left) / static_cast<double>(axis.labels.size());
  const double dodge = words ? std::min(16.0, 0.7 * each / many) : 0.0;
  double low = at.front(), high = at.back();
  if (words) low = 0.0, high = static_cast<double>(at.size());
  const Plot plot{{low, high, left, right}, Scale(values, bottom, top), dodge};

  std::string head = sweep_head(p, width), body;
  const bool one = p.figures.size() == 1;
  const FigureName name = figure_name(p.figures[0]);
  body += svg::text(left, top - 10, one ? name.who + ": " + name.what : name.what, {12, "start", svg::ink, true});
  for (const auto& [value, label] : plot.y.marks()) {
    body += svg::line(left, plot.y.at(value), right, plot.y.at(value), svg::grid);
    body += svg::text(left - 8, plot.y.at(value) + 4, label, {11, "end", svg::soft_ink});
  }
  if (plot.y.empty()) body += svg::text(left + 8, top + 20, "no numbers", {11, "start", svg::soft_ink});
  if (words) {
    for (std::size_t i = 0; i < at.size(); ++i)
      body += svg::text(plot.x.at(at[i]), bottom + 18, svg::fitted(axis.labels[i], each - 6, 11),
                        {11, "middle", svg::soft_ink});
  } else {
    const svg::Ticks ticks = svg::ticks(low, high, 10);
    for (const double value : ticks.values) {
      body += svg::line(plot.x.at(value), top, plot.x.at(value), bottom, svg::grid);
      body += svg::text(plot.x.at(value), bottom + 18, ticks.label(value), {11, "middle", svg::soft_ink});
    }
  }
  const std::string shown = axis.every > 1 ? fmt::format("{} (one value of {})", axis.name, axis.every) : axis.name;
  body += svg::text((left + right) / 2, bottom + 40, svg::fitted(shown, right - left, 12), {12, "middle"});

  Plot dodged = plot;
  if (words) dodged.x.from_px -= dodge * (many - 1.0) / 2.0, dodged.x.to_px -= dodge * (many - 1.0) / 2.0;
  for (std::size_t e = 0; e < p.grid->cells.size() && !words; ++e) body += line_of(p.grid->cells[e], at, plot, e);
  for (std::size_t e = 0; e < p.grid->cells.size(); ++e) body += dots_of(p.grid->cells[e], at, dodged, e, words);

  double x = left, row = 78.0;
  for (std::size_t e = 0; e < p.figures.size(); ++e) {
    const std::string who = figure_name(p.figures[e]).who;
    const double wide = 32.0 + svg::width_px(who, 12);
    if (x > left && x + wide > right) x = left, row += legend_row;
    head += svg::line(x, row, x + 26, row, svg::colour(e), 2.4, svg::dash(e)) + svg::text(x + 32, row + 4, who, {12});
    x += wide + 22;
  }
  const double down = row - 78.0;
  if (down > 0.0) body = fmt::format("<g transform=\"translate(0,{})\">\n{}</g>\n", svg::px(down), body);
  std::string note = "line: median over the noise runs; band: 5 to 95 % of them";
  if (words) note = "dot: median over the noise runs; bar: 5 to 95 % of them";
  if (any_lost) note += "; hollow: the estimator was lost";
  body += svg::text(left, bottom + 64 + down, note, {11, "start", svg::soft_ink});
  return svg::document(width, bottom + 80 + down, p.title, head + body);
}

}  // namespace slipbench
