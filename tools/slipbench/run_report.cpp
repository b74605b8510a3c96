// The summary of a run as text.
#include <fmt/format.h>

#include <cmath>

#include "tools/slipbench/run_result.hpp"
#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

double mean_of(const RunResult& result, std::string_view column) {
  for (const NamedValue& value : result.mean) {
    if (value.name == column) return value.value;
  }
  return std::nan("");
}

std::string drive_text(const RunResult& result) {
  Table table;
  table.column("", "", Table::Align::left);
  table.column("", "");
  table.column("", "", Table::Align::left);
  const auto add = [&](const char* what, Figure value, const char* unit) {
    if (value && !std::isnan(*value)) table.row({what, significant(value), unit});
  };
  add("mean speed", mean_of(result, "speed_rpm"), "rpm");
  add("mean torque", mean_of(result, "torque_Nm"), "N m");
  add("mean stator frequency", mean_of(result, "stator_frequency_Hz"), "Hz");
  add("mean rotor flux", mean_of(result, "rotor_flux_Wb"), "Wb");
  add("speed tracking error, rms", result.drive.speed_tracking_rmse_rpm, "rpm");
  add("dip after a load step", result.drive.load_dip_rpm, "rpm");
  add("recovery from it", result.drive.recovery_s, "s");
  add("peak current", result.drive.peak_current_A, "A");
  add("torque about its mean, rms", result.drive.torque_ripple_Nm, "N m");
  add("copper loss", result.drive.copper_loss_W, "W");
  Figure clipped = result.drive.voltage_clipped_fraction;
  if (clipped) *clipped *= 100.0;
  add("ticks at the voltage limit", clipped, "%");
  return table.text();
}

std::string estimator_text(const RunResult& result) {
  Table table;
  table.column("estimator", "", Table::Align::left);
  table.column("speed rms", "rpm");
  table.column("bias", "rpm");
  table.column("largest", "rpm");
  table.column("flux rms", "Wb");
  table.column("angle rms", "deg");
  table.column("torque rms", "N m");
  table.column("settled at", "s");
  table.column("lost at", "s");
  table.column("step", "ns");
  for (const EstimatorResult& e : result.estimators) {
    const EstimatorFigures& f = e.figures;
    table.row({e.name, significant(f.speed_rmse_rpm), significant(f.speed_bias_rpm), significant(f.speed_max_error_rpm),
               significant(f.flux_rmse_Wb), significant(f.angle_rmse_deg), significant(f.torque_rmse_Nm),
               plain(f.settled_at_s, 4), plain(f.lost_at_s, 4), significant(e.step_ns, 3)});
  }
  return table.text();
}

std::string event_text(const std::vector<ActedEvent>& events) {
  Table table;
  table.column("at", "s");
  table.column("", "", Table::Align::left);
  for (const ActedEvent& e : events) table.row({plain(e.time_s), e.what});
  return table.text();
}

std::string status_text(const RunResult& result) {
  std::string text;
  if (result.outcome.diverged) {
    text += fmt::format("DIVERGED at {} s: {}\n", plain(result.outcome.diverged_at_s), result.outcome.diverged_what);
  }
  if (result.board && result.board->outcome.lost) {
    text += fmt::format("GATES OPENED by the watchdog at {} s; the drive coasted from there\n",
                        plain(static_cast<double>(result.board->outcome.opened_tick) * result.board->control_period_s));
  }
  for (const EstimatorResult& e : result.estimators) {
    if (e.figures.lost_at_s) text += fmt::format("LOST: {} at {} s\n", e.name, plain(e.figures.lost_at_s, 4));
  }
  if (result.interrupted)
    text += fmt::format("INTERRUPTED at {} s; what was done is kept\n", plain(result.outcome.simulated_s, 4));
  if (result.outcome.clipped_samples > 0) {
    text += fmt::format("{} readings of a sensor were at the end of its range\n", result.outcome.clipped_samples);
  }
  return text;
}

}  // namespace

std::string run_summary(const RunResult& result) {
  const Scenario& s = *result.scenario;
  const RunOutcome& o = result.outcome;
  std::string text = fmt::format("{}\n", s.title.empty() ? s.path : s.title);
  text += fmt::format("{} s simulated in {} s ({} times real time), seed {}, scored from {} s to {} s\n\n",
                      plain(o.simulated_s), significant(o.wall_s, 3),
                      significant(o.wall_s > 0.0 ? o.simulated_s / o.wall_s : 0.0, 2), s.seed, plain(s.score.from_s),
                      plain(s.score.to_s));
  text += "Drive\n" + drive_text(result);
  if (!o.events.empty()) text += "\nEvents\n" + event_text(o.events);
  if (!result.estimators.empty()) text += "\nEstimates against the truth\n" + estimator_text(result);
  if (result.board) text += "\nBoard\n" + board_summary(*result.board);
  const std::string status = status_text(result);
  if (!status.empty()) text += "\n" + status;
  if (!result.files.empty()) text += fmt::format("\n{}\n", fmt::join(result.files, "\n"));
  return text;
}

}  // namespace slipbench
