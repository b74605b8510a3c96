#include "tools/slipbench/design_drive.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <memory>

#include "sim/linear/drive_design.hpp"
#include "sim/record/out_file.hpp"
#include "sim/scenario/overrides.hpp"
#include "sim/scenario/table_reader.hpp"
#include "tools/slipbench/linear_json.hpp"
#include "tools/slipbench/table.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

// --set design.KEY is the design's, all else the scenario's.
DriveDesignOptions options_of(const std::vector<Override>& all, std::vector<Override>& of_scenario) {
  Node root;
  std::vector<Override> mine;
  for (const Override& o : all) (o.key.starts_with("design.") ? mine : of_scenario).push_back(o);
  apply_overrides(root, mine);
  DriveDesignOptions options;
  const Node* node = root.child("design");
  if (node == nullptr) return options;
  const TableReader t(*node, "design",
                      {"kind", "current_bandwidth_Hz", "integral_bandwidth_Hz", "faster_than_controller",
                       "integral_action", "observer"});
  if (t.child("kind") != nullptr) (void)t.word("kind", {"state_feedback"});
  const auto above_zero = [&](const char* name) -> std::optional<double> {
    if (t.child(name) == nullptr) return {};
    const double x = t.number(name);
    if (!(x > 0.0) || x > 1e6) t.wrong(*t.child(name), name, "a number above 0, at most 1e+06", "range");
    return x;
  };
  const auto truth = [&](const char* name) -> std::optional<bool> {
    const Node* at = t.child(name);
    if (at == nullptr) return {};
    if (at->kind != Node::Kind::truth) t.wrong(*at, name, "true or false");
    return at->truth;
  };
  options.current_bandwidth_Hz = above_zero("current_bandwidth_Hz");
  options.integral_bandwidth_Hz = above_zero("integral_bandwidth_Hz");
  options.faster_than_controller = above_zero("faster_than_controller");
  options.integral_action = truth("integral_action");
  options.observer = truth("observer").value_or(true);
  return options;
}

std::string report(const DriveDesign& d, const std::string& title, double period_s) {
  std::string out = fmt::format("{}current loop by state feedback, scheduled over {} speeds\n",
                                title.empty() ? "" : title + ": ", d.points.size());
  for (const auto& [name, value] : d.file.made_for) out += fmt::format("  {}: {}\n", name, value);
  Table t;
  t.column("frequency", "Hz");
  t.column("slowest pole", "|z|");
  t.column("time constant", "ms");
  t.column("residual", "");
  t.column("condition", "");
  std::string warnings;
  for (const DriveDesignPoint& p : d.points) {
    double slowest = 0.0;
    for (const linear::Complex& z : p.poles) slowest = std::max(slowest, std::abs(z));
    t.row({plain(p.frequency_Hz, 4), significant(slowest, 4), significant(-1e3 * period_s / std::log(slowest), 3),
           plain(p.residual, 2), plain(p.condition, 3)});
    if (!p.warning.empty()) warnings += fmt::format("Warning at {} Hz: {}\n", plain(p.frequency_Hz, 4), p.warning);
  }
  return out + "\n" + t.text() + warnings;
}

}  // namespace

int design_of_drive(const Request& request) {
  std::vector<Override> of_scenario;
  const DriveDesignOptions options = options_of(request.overrides, of_scenario);
  const Scenario scenario = read_scenario(request.file, of_scenario, request.seed);
  std::unique_ptr<OutFile> file;
  if (!request.write.empty()) file = std::make_unique<OutFile>(request.write);
  const DriveDesign design = design_drive(scenario, options);
  if (file) {
    file->write(gain_file_text(design.file));
    file->finish();
  }
  if (request.json) {
    print(linear_json(design, scenario.title));
  } else if (!request.quiet) {
    std::string text = report(design, scenario.title, scenario.run.control_period_s);
    if (file)
      text += fmt::format("gains: {}; a scenario takes them by [controller] kind = \"state_feedback\", file = \"{}\"\n",
                          request.write, request.write);
    print(text);
  }
  return ExitStatus::done;
}

}  // namespace slipbench
