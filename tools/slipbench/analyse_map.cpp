// analyse --map: where a drive's speed can be seen, and where an estimator is stable, over the torque-speed plane.
#include <fmt/format.h>

#include <algorithm>
#include <memory>

#include "sim/linear/estimator_map.hpp"
#include "sim/linear/operating_point.hpp"
#include "sim/record/out_file.hpp"
#include "sim/scenario/nearest.hpp"
#include "tools/slipbench/analyse_drive.hpp"
#include "tools/slipbench/interrupt.hpp"
#include "tools/slipbench/linear_json.hpp"
#include "tools/slipbench/map_csv.hpp"
#include "tools/slipbench/map_figure.hpp"
#include "tools/slipbench/map_report.hpp"
#include "tools/slipbench/told_progress.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

linear::SpeedModel model_of(const std::string& word) {
  for (const auto model : {linear::SpeedModel::unknown_load, linear::SpeedModel::known_load}) {
    if (word == linear::name_of(model)) return model;
  }
  return linear::SpeedModel::constant_speed;
}

// Output files, opened before the work.
struct Outputs {
  std::unique_ptr<OutFile> csv, path, figure;
  std::string names;

  explicit Outputs(const Request& request) {
    const auto open = [&](const std::string& name, const char* what) -> std::unique_ptr<OutFile> {
      if (name.empty()) return nullptr;
      names += fmt::format("{}: {}\n", what, name);
      return std::make_unique<OutFile>(name);
    };
    csv = open(request.csv, "map"), path = open(request.path, "path"), figure = open(request.figure, "figure");
  }
};

void finish(const std::unique_ptr<OutFile>& file, const std::string& text) {
  if (!file) return;
  file->write(text);
  file->finish();
}

template <class Map>
int told(const Request& request, const Outputs& out, const Map& map) {
  if (interrupted()) return ExitStatus::stopped;
  finish(out.csv, csv_of(map));
  finish(out.figure, map_figure(map));
  if (request.json)
    print(linear_json(map));
  else if (!request.quiet)
    print(map_report(map) + out.names);
  return ExitStatus::done;
}

int speed_observability(const Request& request, FileKind kind) {
  if (!request.estimator.empty())
    throw InputError("command line", "--estimator", "--estimator goes with --map estimator_stability", "usage");
  SpeedMapOptions options;
  options.model = model_of(request.speed_model);
  const auto progress = told_progress("map", request.progress, request.quiet);
  if (kind == FileKind::machine) {
    if (!request.path.empty() || !request.speed_model.empty())
      throw InputError("command line", request.path.empty() ? "--model" : "--path",
                       "--model and --path want a scenario: a machine file has neither shaft nor run", "usage");
    const MachineSettings machine = read_machine(request.file, request.overrides);
    const Outputs out(request);
    return told(request, out, speed_map(machine, options, progress));
  }
  const Scenario scenario = read_scenario(request.file, request.overrides, request.seed);
  const Outputs out(request);
  const ObservabilityMap map = speed_map(scenario, options, progress);
  if (out.path && map.path && !interrupted()) finish(out.path, csv_of(*map.path));
  return told(request, out, map);
}

// The scenario's estimator of that name, or a built-in kind; without a name the first one, or luenberger where there is none.
EstimatorMap map_of_estimator(const Request& request, const Scenario& scenario,
                              const std::function<bool(double)>& progress) {
  const EstimatorMapOptions options;
  std::vector<std::string_view> known;
  for (std::size_t i = 0; i < scenario.estimators.size(); ++i) {
    const std::string& name = scenario.estimators[i].name;
    if (request.estimator.empty() || request.estimator == name) return estimator_map(scenario, i, options, progress);
    known.push_back(name);
  }
  for (const std::string_view kind : mapped_estimator_kinds()) {
    if (request.estimator == kind) return estimator_map(scenario, request.estimator, options, progress);
    known.push_back(kind);
  }
  if (request.estimator.empty()) return estimator_map(scenario, "luenberger", options, progress);
  throw InputError(
      "command line", "--estimator",
      fmt::format(
          "--estimator '{}' is no estimator of the scenario and no kind with a map; there are {}; the nearest is {}",
          request.estimator, fmt::join(known, ", "), nearest(request.estimator, known)),
      "usage");
}

}  // namespace

int map_of_drive(const Request& request, FileKind kind) {
  if (request.map == "speed_observability") return speed_observability(request, kind);
  if (!request.path.empty() || !request.speed_model.empty())
    throw InputError("command line", request.path.empty() ? "--model" : "--path",
                     "--model and --path go with --map speed_observability", "usage");
  Scenario scenario = kind == FileKind::machine ? machine_on_mains(read_machine(request.file, request.overrides))
                                                : read_scenario(request.file, request.overrides, request.seed);
  if (kind == FileKind::machine) scenario.title = scenario.machine.title;
  const Outputs out(request);
  return told(request, out, map_of_estimator(request, scenario, told_progress("map", request.progress, request.quiet)));
}

}  // namespace slipbench
