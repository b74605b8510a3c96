// What each drawn key decides: its share of the variance, alone (full bar) and with all that it acts through (outline behind).
#include <fmt/format.h>

#include <algorithm>
#include <numeric>

#include "tools/slipbench/svg.hpp"
#include "tools/slipbench/sweep_figure.hpp"

namespace slipbench {

namespace {

constexpr std::size_t most_keys = 12;
constexpr double bar = 12, between_keys = 12;

double weight(const KeyShares& key) { return key.total ? key.total->value : key.first.value; }

std::string whisker(const Share& share, const svg::Axis& x, double y) {
  const auto inside = [&](double value) { return x.at(std::clamp(value, x.low, x.high)); };
  std::string out = svg::line(inside(share.low), y, inside(share.high), y, svg::ink);
  for (const double end : {share.low, share.high}) {  // one that runs off has no end
    if (end >= x.low && end <= x.high) out += svg::line(x.at(end), y - 2.5, x.at(end), y + 2.5, svg::ink);
  }
  return out;
}

// "belief.a+belief.b", or "a+b" where that has no room.
std::string fitted_key(const std::string& key, double room) {
  if (svg::width_px(key, 12) <= room) return key;
  std::string bare;
  for (std::size_t from = 0; from <= key.size();) {
    const std::size_t to = std::min(key.find('+', from), key.size());
    const std::string one = key.substr(from, to - from);
    bare += (bare.empty() ? "" : "+") + one.substr(one.find('.') == std::string::npos ? 0 : one.find('.') + 1);
    from = to + 1;
  }
  return svg::fitted(bare, room, 12);
}

}  // namespace

std::string sweep_shares(const SweepPicture& p, double left, double right, double& top) {
  std::vector<std::size_t> order(p.drawn.size());
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::vector<double> largest(p.drawn.size(), 0.0);
  bool totals = false, told = false;
  std::string remarks;
  for (const FigureSensitivity& one : p.shares) {
    for (std::size_t j = 0; j < one.shares.keys.size(); ++j) {
      largest[j] = std::max(largest[j], weight(one.shares.keys[j]));
      totals = totals || one.shares.keys[j].total.has_value();
      told = true;
    }
    const std::string who = figure_name(one.figure).who;
    if (!one.shares.none.empty()) remarks += fmt::format("; {}: {}", who, one.shares.none);
    if (one.shares.lost > 0)
      remarks += fmt::format("; {}: {} of {} points lost", who, one.shares.lost, one.shares.lost + one.shares.used);
  }
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return largest[a] > largest[b]; });
  const std::size_t shown = std::min(order.size(), most_keys);
  if (shown < order.size()) remarks += fmt::format("; {} smaller keys are not shown", order.size() - shown);

  std::string out = svg::text(24, top + 26, "share of the variance that a key decides", {12, "start", svg::ink, true});
  const std::string legend =
      totals ? "full: alone (first order); pale: with its interactions (total); lines: 95 % intervals"
             : "alone (first order); lines: 95 % intervals; totals need kind = \"saltelli\"";
  out += svg::text(24, top + 43, legend + remarks, {11, "start", svg::soft_ink});
  top += 58;
  if (!told) return out;
  const double each = static_cast<double>(p.shares.size()) * bar + between_keys;
  const double bottom = top + each * static_cast<double>(shown);
  const svg::Axis x{0.0, 1.0, left, right};
  for (const double mark : {0.0, 0.2, 0.4, 0.6, 0.8, 1.0}) {
    out += svg::line(x.at(mark), top, x.at(mark), bottom, mark == 0.0 ? svg::frame : svg::grid);
    out += svg::text(x.at(mark), bottom + 17, fmt::format("{:.1f}", mark), {11, "middle", svg::soft_ink});
  }
  for (std::size_t i = 0; i < shown; ++i) {
    const double row = top + each * static_cast<double>(i);
    out += svg::text(left - 10, row + each / 2 + 4, fitted_key(p.drawn[order[i]], left - 34), {12, "end"});
    for (std::size_t e = 0; e < p.shares.size(); ++e) {
      if (p.shares[e].shares.keys.empty()) continue;
      const KeyShares& key = p.shares[e].shares.keys[order[i]];
      const double y = row + between_keys / 2 + bar * static_cast<double>(e), height = bar - 2;
      const auto wide = [&](double value) { return x.at(std::clamp(value, 0.0, 1.0)) - left; };
      if (key.total) out += svg::rectangle(left, y, wide(key.total->value), height, svg::colour(e), 0.3);
      out += svg::rectangle(left, y, wide(key.first.value), height, svg::colour(e), key.total ? 1.0 : 0.85);
      if (key.total) out += whisker(*key.total, x, y + 0.7 * height);
      out += whisker(key.first, x, y + (key.total ? 0.3 : 0.5) * height);
    }
  }
  top = bottom + 24;
  return out;
}

}  // namespace slipbench
