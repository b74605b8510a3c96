// Two keys: a cell a case, the darker the larger.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "tools/slipbench/heat.hpp"
#include "tools/slipbench/scale.hpp"
#include "tools/slipbench/svg.hpp"
#include "tools/slipbench/sweep_figure.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

constexpr double top = 96, plot_width = 616, plot_height = 440, bar_gap = 28, bar_width = 18, bar_room = 96;
constexpr std::string_view lost_mark = "#D55E00";

// Every how many-th label has room.
std::size_t label_every(double room_each, double wanted) {
  return std::max<std::size_t>(1, static_cast<std::size_t>(std::ceil(wanted / room_each)));
}

std::string key_name(const GridAxis& axis) {
  return axis.every > 1 ? fmt::format("{} (one value of {})", axis.name, axis.every) : axis.name;
}

}  // namespace

std::string sweep_map(const SweepPicture& p) {
  const GridAxis &xs = p.grid->axes[0], &ys = p.grid->axes[1];
  const std::vector<Cell>& cells = p.grid->cells[0];
  const std::size_t nx = xs.labels.size(), ny = ys.labels.size();
  double y_labels = 0.0, x_labels = 0.0;
  for (const std::string& label : ys.labels) y_labels = std::max(y_labels, svg::width_px(label, 11));
  for (const std::string& label : xs.labels) x_labels = std::max(x_labels, svg::width_px(label, 11));
  y_labels = std::min(y_labels, 160.0), x_labels = std::min(x_labels, 160.0);
  const double left = 24 + 22 + y_labels + 10, w = plot_width / static_cast<double>(nx),
               h = plot_height / static_cast<double>(ny), bottom = top + plot_height;
  const double width = left + plot_width + bar_gap + bar_width + bar_room;

  std::vector<double> values;
  for (const Cell& cell : cells) {
    if (cell.median) values.push_back(*cell.median);
  }
  const Scale scale(values, bottom, top);
  std::string body = sweep_head(p, width);
  const FigureName name = figure_name(p.figures[0]);
  body += svg::text(left, top - 12, name.who + ": " + name.what + (p.runs > 1 ? ", median over the noise runs" : ""),
                    {12, "start", svg::ink, true});
  bool any_none = false, any_lost = false;
  for (std::size_t x = 0; x < nx; ++x) {
    for (std::size_t y = 0; y < ny; ++y) {
      const Cell& cell = cells[x * ny + y];
      const double at_x = left + w * static_cast<double>(x), at_y = bottom - h * static_cast<double>(y + 1);
      if (!cell.median) {
        body += crossed_cell(at_x, at_y, w, h);
        any_none = true;
        continue;
      }
      const double share = scale.share(*cell.median);
      body += svg::rectangle(at_x, at_y, w, h, heat(share));
      const std::string number = significant(cell.median, 3);
      if (svg::width_px(number, 10) + 4 < w && h > 16)
        body += svg::text(at_x + w / 2, at_y + h / 2 + 4, number, {10, "middle", share > 0.65 ? "#ffffff" : svg::ink});
      if (!cell.lost) continue;
      const double r = std::clamp(0.12 * std::min(w, h), 1.2, 4.0);
      body += svg::circle(at_x + w - 2 * r, at_y + 2 * r, r + 0.8, "#ffffff") +
              svg::circle(at_x + w - 2 * r, at_y + 2 * r, r, lost_mark);
      any_lost = true;
    }
  }
  const std::size_t x_every = label_every(w, x_labels + 10), y_every = label_every(h, 15);
  for (std::size_t x = 0; x < nx; x += x_every)
    body += svg::text(left + w * (static_cast<double>(x) + 0.5), bottom + 18, svg::fitted(xs.labels[x], 160, 11),
                      {11, "middle", svg::soft_ink});
  for (std::size_t y = 0; y < ny; y += y_every)
    body += svg::text(left - 8, bottom - h * (static_cast<double>(y) + 0.5) + 4, svg::fitted(ys.labels[y], 160, 11),
                      {11, "end", svg::soft_ink});
  body += svg::text(left + plot_width / 2, bottom + 40, svg::fitted(key_name(xs), plot_width, 12), {12, "middle"});
  body += svg::upright_text(34, top + plot_height / 2, svg::fitted(key_name(ys), plot_height, 12), {12, "middle"});

  if (!scale.empty()) {
    const double bar = left + plot_width + bar_gap;
    constexpr int slices = 60;
    for (int i = 0; i < slices; ++i) {
      const double each = plot_height / slices;
      body += svg::rectangle(bar, bottom - each * (i + 1), bar_width, each + 0.5, heat((i + 0.5) / slices));
    }
    for (const auto& [value, label] : scale.marks()) {
      body += svg::line(bar + bar_width, scale.at(value), bar + bar_width + 5, scale.at(value), svg::frame);
      body += svg::text(bar + bar_width + 9, scale.at(value) + 4, label, {11, "start", svg::soft_ink});
    }
  }
  double row = bottom + 62;
  if (any_none) {
    body += crossed_cell(left, row - 11, 16, 12) +
            svg::text(left + 24, row, "no figure: not run, diverged, refused, or nothing to judge",
                      {11, "start", svg::soft_ink});
    row += 18;
  }
  if (any_lost) {
    body += svg::circle(left + 8, row - 4, 4, lost_mark) +
            svg::text(left + 24, row, "the estimator was lost", {11, "start", svg::soft_ink});
    row += 18;
  }
  return svg::document(width, row, p.title, body);
}

}  // namespace slipbench
