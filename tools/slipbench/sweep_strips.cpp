// Many keys: how a figure is spread over all rows, a strip an estimator; beneath, what each drawn key decides.
#include <fmt/format.h>

#include <algorithm>

#include "tools/slipbench/scale.hpp"
#include "tools/slipbench/svg.hpp"
#include "tools/slipbench/sweep_figure.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

constexpr double width = 860, right = 836, top = 128, row_height = 44;

}  // namespace

std::string sweep_head(const SweepPicture& p, double width) {
  return svg::text(24, 32, svg::fitted(p.title, width - 48, 17, true), {17, "start", svg::ink, true}) +
         svg::text(24, 53, svg::fitted(p.subtitle, width - 48, 12), {12, "start", svg::soft_ink});
}

std::string sweep_figure(const SweepPicture& p) {
  if (!p.grid) return sweep_strips(p);
  return p.grid->axes.size() == 2 ? sweep_map(p) : sweep_lines(p);
}

std::string sweep_strips(const SweepPicture& p) {
  double longest = 110.0;
  for (const std::string& figure : p.figures)
    longest = std::max(longest, svg::width_px(figure_name(figure).who, 13, true));
  for (const std::string& key : p.drawn) longest = std::max(longest, svg::width_px(key, 12));
  longest = std::min(longest, 230.0);
  const double left = 24 + longest + 16;
  std::vector<double> values;
  for (const Strip& strip : p.strips) values.insert(values.end(), strip.quantiles.begin(), strip.quantiles.end());
  const Scale x(values, left, right);
  double bottom = top + row_height * static_cast<double>(p.strips.size());
  std::string body = sweep_head(p, width);
  body += svg::text(24, top - 34, figure_name(p.figures[0]).what, {12, "start", svg::ink, true});
  body += svg::text(24, top - 17, "line: 5 to 95 % of all rows; box: 25 to 75 %; bar and number: median",
                    {11, "start", svg::soft_ink});
  for (std::size_t e = 0; e < p.strips.size(); e += 2)
    body += svg::rectangle(12, top + row_height * static_cast<double>(e), width - 24, row_height, "#f7f7f7");
  for (const auto& [value, label] : x.marks()) {
    body += svg::line(x.at(value), top, x.at(value), bottom, svg::grid);
    body += svg::text(x.at(value), bottom + 17, label, {11, "middle", svg::soft_ink});
  }
  for (std::size_t e = 0; e < p.strips.size(); ++e) {
    const Strip& strip = p.strips[e];
    const double middle = top + row_height * (static_cast<double>(e) + 0.5);
    body +=
        svg::text(24, middle + (strip.missing > 0 ? 0 : 4),
                  svg::fitted(figure_name(p.figures[e]).who, longest, 13, true), {13, "start", svg::colour(e), true});
    if (strip.missing > 0)
      body += svg::text(24, middle + 14, fmt::format("{} rows without", strip.missing), {11, "start", svg::soft_ink});
    if (strip.quantiles.empty()) {
      body += svg::text(left, middle + 4, "no numbers", {11, "start", svg::soft_ink});
      continue;
    }
    const auto at = [&](std::size_t i) { return x.at(strip.quantiles[i]); };
    body += svg::line(at(0), middle + 5, at(4), middle + 5, svg::colour(e), 1.6);
    body += svg::rectangle(at(1), middle - 2, std::max(at(3) - at(1), 1.0), 14, "#ffffff") +
            svg::rectangle(at(1), middle - 2, std::max(at(3) - at(1), 1.0), 14, svg::colour(e), 0.45);
    body += svg::line(at(2), middle - 5, at(2), middle + 15, svg::ink, 2.4);
    const std::string number = significant(strip.quantiles[2], 3);
    const double half = svg::width_px(number, 11) / 2;
    body += svg::text(std::clamp(at(2), left + half, right - half), middle - 9, number, {11, "middle", svg::ink});
  }
  bottom += 34;
  if (!p.shares.empty()) body += sweep_shares(p, left, right, bottom);
  return svg::document(width, bottom + 10, p.title, body);
}

}  // namespace slipbench
