// What `export` tells a person.
#include <fmt/format.h>

#include "tools/slipbench/export_result.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

std::vector<ShortestPeriod> ExportResult::periods() const {
  std::vector<ShortestPeriod> all;
  const BoardCost* controller = nullptr;
  for (std::size_t i = 0; i < costs.size(); ++i) {
    all.push_back({costs[i].name, static_cast<double>(costs[i].most)});
    if (parts[i].is_controller) controller = &costs[i];
  }
  for (std::size_t i = 0; controller != nullptr && i < costs.size(); ++i) {
    if (!parts[i].is_controller)
      all.push_back({controller->name + " + " + costs[i].name, static_cast<double>(controller->most + costs[i].most)});
  }
  return all;
}

std::string export_summary(const ExportResult& r) {
  Table made;
  made.column("part", "", Table::Align::left);
  made.column("kind", "", Table::Align::left);
  made.column("state", "bytes");
  made.column("operations", "a step");
  made.column("vectors", "ticks");
  for (const ExportedPart& part : r.parts)
    made.row({part.name, part.kind, fmt::format("{}", part.state_bytes), fmt::format("{}", part.operations.all()),
              fmt::format("{}", part.stretches * part.ticks)});
  std::string text = fmt::format("{}: C99 in {}, to {}/\n{}", r.scenario, r.precision, r.folder, made.text());
  if (!r.costs.empty()) {
    Table cost;
    cost.column("on a Cortex-M4F", "", Table::Align::left);
    cost.column("flash", "bytes");
    cost.column("least", "instructions");
    cost.column("mean", "instructions");
    cost.column("most", "instructions");
    for (const BoardCost& c : r.costs)
      cost.row({c.name, fmt::format("{}", c.flash_bytes), fmt::format("{}", c.least), fmt::format("{:.1f}", c.mean),
                fmt::format("{}", c.most)});
    Table period;
    period.column("shortest control period", "", Table::Align::left);
    period.column(plain(r.band.least) + " clocks", "us");
    period.column(plain(r.band.most) + " clocks", "us");
    period.column("share of " + plain(r.control_period_s * 1e6) + " us", "%");
    for (const ShortestPeriod& p : r.periods()) {
      const double low = r.band.least_us(p.instructions), high = r.band.most_us(p.instructions);
      const double percent_per_us = 1e-4 / r.control_period_s;
      period.row({p.of, significant(low, 3), significant(high, 3),
                  significant(low * percent_per_us, 2) + " - " + significant(high * percent_per_us, 2)});
    }
    text += fmt::format(
        "\n{}\n{}Instructions were counted on an emulated board, where every bit of the vectors was alike. They are "
        "not time: a\n"
        "clock of {} MHz and {} to {} clocks per instruction (flash wait states, divisions, stalls) are assumed.\n"
        "Interrupt entry, ADC, PWM and protection come on top. Measure on your part.\n",
        cost.text(), period.text(), plain(r.band.clock_MHz), plain(r.band.least), plain(r.band.most));
  }
  text += fmt::format(
      "\nTo see that a build keeps the bits:  cd {}; cc -std=c99 -O2 -ffp-contract=off -fno-math-errno {}.c "
      "{}_replay.c && "
      "./a.out\n\n"
      "Caution: first trials with the power stage disconnected or the DC link current-limited, an emergency stop "
      "within\n"
      "reach, by qualified people under local codes. This is not a safety function.\n",
      r.folder, r.parts.front().name, r.parts.front().name);
  return text;
}

}  // namespace slipbench
