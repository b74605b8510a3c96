#include "sim/linear/scenario_path.hpp"

#include <array>

#include "plant/math/numbers.hpp"
#include "sim/engine/simulate.hpp"
#include "sim/linear/flux_rule.hpp"

namespace slipbench {
namespace {

constexpr double hardly_any_flux = 0.1;

struct Recorder : RunObserver {
  double blind_below_Hz, least_flux, period_s = 0.0;
  const std::function<double(const PlantRow&)>& observability;
  ScenarioPath path;
  double stretch_s = 0.0, stretch_from_s = 0.0;

  Recorder(double blind_below, double least, const std::function<double(const PlantRow&)>& value)
      : blind_below_Hz(blind_below), least_flux(least), observability(value) {}

  void begin(const RunInfo& info) override { period_s = info.trace_period_s; }
  void trace_row(const RowView& view) override {
    const PlantRow& row = *view.plant;
    // A row stands for the period that begins with it; the last for none.
    if (!path.points.empty()) account(path.points.back());
    PathPoint p{row[P::time], row[P::speed_rpm], row[P::torque], row[P::stator_frequency], row[P::rotor_flux], false,
                0.0};
    p.blind = fabs(p.stator_frequency_Hz) < blind_below_Hz || p.rotor_flux_Wb < least_flux;
    p.observability = observability(row);
    path.points.push_back(p);
  }
  void account(const PathPoint& last) {
    path.duration_s += period_s;
    if (!last.blind) {
      stretch_s = 0.0;
      return;
    }
    if (stretch_s == 0.0) stretch_from_s = last.time_s;
    path.blind_s += period_s;
    stretch_s += period_s;
    if (stretch_s <= path.longest_blind_s) return;
    path.longest_blind_s = stretch_s;
    path.longest_from_s = stretch_from_s;
  }
};

}  // namespace

ScenarioPath path_of(const Scenario& scenario, double blind_below_Hz,
                     const std::function<double(const PlantRow&)>& observability, const MapProgress& progress) {
  Recorder recorder(blind_below_Hz, hardly_any_flux * FluxRule(scenario).at(0.0, 0.0), observability);
  const std::array<RunObserver*, 1> observers{&recorder};
  RunOptions options;
  options.keep_going = progress;
  const RunOutcome outcome = simulate(scenario, observers, options);
  recorder.path.diverged = outcome.diverged;
  recorder.path.blind_below_Hz = blind_below_Hz;
  return recorder.path;
}

}  // namespace slipbench
