// Which drawn key decides a figure, as a table: largest first.
#include <fmt/format.h>

#include <algorithm>
#include <numeric>

#include "tools/slipbench/sweep_result.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

constexpr std::size_t most_keys = 10;  // of each figure

std::string interval(const Share& share) { return fmt::format("{:.2f} to {:.2f}", share.low, share.high); }

std::vector<std::size_t> largest_first(const std::vector<KeyShares>& keys) {
  std::vector<std::size_t> order(keys.size());
  std::iota(order.begin(), order.end(), std::size_t{0});
  const auto weight = [&](std::size_t j) { return keys[j].total ? keys[j].total->value : keys[j].first.value; };
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return weight(a) > weight(b); });
  return order;
}

}  // namespace

std::string sensitivity_text(const SweepResult& r) {
  if (r.sensitivities.empty()) return "";
  const bool totals = r.plan->sample->kind == DrawKind::saltelli;
  const std::vector<std::string> names = drawn_names(*r.plan);
  Table table;
  table.column("figure", "", Table::Align::left);
  table.column("key", "", Table::Align::left);
  table.column("first", "");
  table.column("95 %", "", Table::Align::left);
  if (totals) table.column("total", ""), table.column("95 %", "", Table::Align::left);
  std::string remarks;
  bool any = false;
  for (const FigureSensitivity& one : r.sensitivities) {
    if (!one.shares.none.empty()) remarks += fmt::format("{}: nothing to tell, {}\n", one.figure, one.shares.none);
    if (one.shares.lost > 0)
      remarks += fmt::format("{}: {} of {} {} LOST and left out: a figure is missing\n", one.figure, one.shares.lost,
                             one.shares.lost + one.shares.used, totals ? "base points" : "cases");
    const std::vector<std::size_t> order = largest_first(one.shares.keys);
    for (std::size_t i = 0; i < std::min(order.size(), most_keys); ++i) {
      const KeyShares& key = one.shares.keys[order[i]];
      std::vector<std::string> cells = {i == 0 ? one.figure : "", names[order[i]],
                                        fmt::format("{:.3f}", key.first.value), interval(key.first)};
      if (key.total) cells.insert(cells.end(), {fmt::format("{:.3f}", key.total->value), interval(*key.total)});
      table.row(std::move(cells));
      any = true;
    }
    if (order.size() > most_keys)
      remarks += fmt::format("{}: {} smaller keys in --json\n", one.figure, order.size() - most_keys);
  }
  std::string text = "\nWhich key decides: share of the variance";
  if (r.plan->runs > 1) text += fmt::format(" of the mean of a case's {} runs", r.plan->runs);
  text += totals ? "; first: alone, total: with all that it acts through\n" : "; first: alone\n";
  if (any) text += table.text();
  if (!totals) text += "Totals, which tell what keys do together, need kind = \"saltelli\"\n";
  if (r.lost > 0)
    text += "Rows in which an estimator was lost count as they are: few large errors may make up most of a variance\n";
  return text + remarks;
}

}  // namespace slipbench
