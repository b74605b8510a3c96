#include "tools/slipbench/sweep_picture.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "sim/scenario/nearest.hpp"
#include "sim/scenario/scenario.hpp"

namespace slipbench {

namespace {

constexpr std::string_view usual = "speed_rmse_rpm", of_drive = "drive.speed_tracking_rmse_rpm";
constexpr std::size_t most_on_a_map = 120,
                      most_on_a_line = 400;  // values of an axis: more would be thinner than a line

bool of_estimator(const std::string& column, std::string_view figure) {
  return column.ends_with("." + std::string(figure)) && !column.starts_with("drive.");
}

// An axis, and the place on it of each of the plan's values; none for those that are not shown.
struct Placed {
  GridAxis axis;
  std::vector<std::optional<std::size_t>> place;
};

Placed placed(const Vary& vary, std::size_t most) {
  Placed p;
  for (const std::string& key : vary.keys) p.axis.name += (p.axis.name.empty() ? "" : ", ") + key;
  std::vector<double> numbers;
  for (const std::string& value : vary.values) {
    char* end = nullptr;
    const double number = std::strtod(value.c_str(), &end);
    if (!value.empty() && end == value.c_str() + value.size()) numbers.push_back(number);
  }
  std::vector<std::size_t> order(vary.values.size());
  std::iota(order.begin(), order.end(), std::size_t{0});
  const bool are_numbers = numbers.size() == vary.values.size();
  if (are_numbers)
    std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return numbers[a] < numbers[b]; });
  p.axis.every = (order.size() + most - 1) / most;
  p.place.resize(order.size());
  for (std::size_t i = 0; i < order.size(); i += p.axis.every) {
    p.place[order[i]] = p.axis.labels.size();
    p.axis.labels.push_back(are_numbers ? fmt::format("{:.5g}", numbers[order[i]]) : vary.values[order[i]]);
    if (are_numbers) p.axis.numbers.push_back(numbers[order[i]]);
  }
  return p;
}

double at_share(const std::vector<double>& sorted, double share) {
  return sorted[static_cast<std::size_t>(share * static_cast<double>(sorted.size() - 1) + 0.5)];
}

Cell cell_of(std::vector<double>& values, bool lost) {
  Cell cell;
  cell.lost = lost;
  if (values.empty()) return cell;
  std::sort(values.begin(), values.end());
  cell.low = at_share(values, 0.05), cell.median = at_share(values, 0.5), cell.high = at_share(values, 0.95);
  return cell;
}

// `varies`: those with more than one value, in the plan's order.
Grid grid_of(const std::vector<const Vary*>& varies, const Store& store, const std::vector<std::string>& figures) {
  Grid grid;
  std::vector<Placed> axes;
  for (const Vary* vary : varies) axes.push_back(placed(*vary, varies.size() == 1 ? most_on_a_line : most_on_a_map));
  std::size_t count = 1;
  for (const Placed& p : axes) grid.axes.push_back(p.axis), count *= p.axis.labels.size();
  grid.cells.assign(figures.size(), std::vector<Cell>(count));

  // Beside each figure, when its estimator was lost.
  std::vector<std::string> columns = figures;
  for (const std::string& figure : figures) {
    const std::string lost = figure.substr(0, figure.find('.')) + ".lost_at_s";
    const auto& all = store.columns().figures;
    columns.push_back(std::find(all.begin(), all.end(), lost) != all.end() ? lost : figure);
  }
  const auto cell_at = [&](std::uint64_t k) -> std::optional<std::size_t> {
    std::size_t at = 0, stride = 1;
    for (std::size_t a = axes.size(); a-- > 0;) {
      const std::size_t values = axes[a].place.size();
      const auto place = axes[a].place[k % values];
      if (!place) return {};
      at += *place * stride, stride *= axes[a].axis.labels.size(), k /= values;
    }
    return at;
  };
  std::vector<std::vector<double>> runs(figures.size());
  std::vector<bool> lost(figures.size());
  std::uint64_t at = 0;
  const auto finish = [&] {
    const auto cell = cell_at(at);
    for (std::size_t f = 0; f < figures.size(); ++f) {
      if (cell) grid.cells[f][*cell] = cell_of(runs[f], lost[f]);
      runs[f].clear(), lost[f] = false;
    }
  };
  store.each_figures(columns, [&](std::uint64_t k, const std::vector<Figure>& values) {
    if (k != at) finish();
    at = k;
    for (std::size_t f = 0; f < figures.size(); ++f) {
      if (values[f]) runs[f].push_back(*values[f]);
      if (columns[figures.size() + f] != figures[f] && values[figures.size() + f]) lost[f] = true;
    }
  });
  finish();
  return grid;
}

Strip strip_of(const Store& store, const std::string& figure, std::uint64_t rows) {
  const std::uint64_t count = store.figure_count(figure);
  Strip strip{{}, rows - count};
  if (count == 0) return strip;
  std::vector<std::uint64_t> ranks;
  for (const double share : {0.05, 0.25, 0.5, 0.75, 0.95})
    ranks.push_back(static_cast<std::uint64_t>(share * static_cast<double>(count - 1) + 0.5));
  strip.quantiles = store.at_ranks(figure, ranks);
  return strip;
}

}  // namespace

FigureName figure_name(const std::string& column) {
  const std::size_t dot = column.find('.');
  FigureName name{column.substr(0, dot), column.substr(dot + 1)};
  std::string_view unit;
  const auto look = [&](const auto& entries) {
    for (const auto& entry : entries) {
      if (entry.name == name.what) unit = entry.unit;
    }
  };
  look(estimator_figures), look(drive_figures);
  if (!unit.empty()) name.what.resize(name.what.rfind('_'));
  std::replace(name.what.begin(), name.what.end(), '_', ' ');
  if (!unit.empty()) name.what += ", " + std::string(unit);
  return name;
}

std::vector<std::string> chosen_figures(const StoreColumns& columns, const std::string& figure_of) {
  const std::string wanted = figure_of.empty() ? std::string(usual) : figure_of;
  std::vector<std::string> found;
  for (const std::string& column : columns.figures) {
    if (column == wanted || column == "drive." + wanted) return {column};
    if (of_estimator(column, wanted)) found.push_back(column);
  }
  if (!found.empty()) return found;
  if (figure_of.empty()) return {std::string(of_drive)};
  std::vector<std::string> known = columns.figures;
  for (const auto& entry : estimator_figures) known.emplace_back(entry.name);
  const std::string near(nearest(figure_of, {known.begin(), known.end()}));
  throw InputError("command line", "--figure-of",
                   fmt::format("--figure-of '{}': this sweep has no such figure; the nearest is {}; a figure of one "
                               "estimator is NAME.FIGURE, FIGURE alone is that of all estimators",
                               figure_of, near),
                   "usage");
}

std::vector<std::string> judged_figures(const StoreColumns& columns, const std::vector<std::string>& chosen) {
  std::vector<std::string> judged;
  for (const std::string& column : columns.figures) {
    const bool asked = std::find(chosen.begin(), chosen.end(), column) != chosen.end();
    if (asked || of_estimator(column, usual) || column == of_drive) judged.push_back(column);
  }
  return judged;
}

SweepPicture picture_of(const SweepPlan& plan, const Store& store, const std::vector<std::string>& figures,
                        const std::vector<FigureSensitivity>& shares) {
  SweepPicture picture;
  const std::uint64_t rows = store.rows();
  picture.title = plan.title.empty() ? plan.path : plan.title;
  picture.subtitle =
      fmt::format("{} cases x {} noise run{} of {}", plan.cases(), plan.runs, plan.runs == 1 ? "" : "s", plan.scenario);
  const std::uint64_t all = plan.cases() * plan.runs,
                      failed = store.status_count("diverged") + store.status_count("refused");
  if (rows < all) picture.subtitle += fmt::format("; {} rows not run", all - rows);
  if (failed > 0) picture.subtitle += fmt::format("; {} rows diverged or were refused", failed);
  picture.runs = plan.runs;
  picture.figures = figures;
  std::vector<const Vary*> varies;
  for (const Vary& vary : plan.varies) {
    if (vary.values.size() > 1) varies.push_back(&vary);
  }
  if (varies.size() == 1 || varies.size() == 2) {
    if (varies.size() == 2) picture.figures.resize(1);  // one map
    picture.grid = grid_of(varies, store, picture.figures);
    return picture;
  }
  for (const std::string& figure : figures) picture.strips.push_back(strip_of(store, figure, rows));
  if (!plan.sample) return picture;
  picture.drawn = drawn_names(plan);
  for (const std::string& figure : figures) {
    for (const FigureSensitivity& share : shares) {
      if (share.figure == figure) picture.shares.push_back(share);
    }
  }
  return picture;
}

}  // namespace slipbench
