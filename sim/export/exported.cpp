// Finds the method of each part, runs the scenario in the precision asked for, and has the files written.
#include "sim/export/exported.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <bit>

#include "controllers/methods.hpp"
#include "estimators/methods.hpp"
#include "sim/engine/ports.hpp"
#include "sim/engine/simulate.hpp"
#include "sim/export/c_files.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

template <class S>
RecordedStep<S> record_estimator(const RunSetup& setup, std::size_t which) {
  RecordedStep<S> step;
  int index = 0;
  each_estimator_method([&]<class Method>() {
    if (index++ == setup.shape.control.estimators[which].index)
      step = record_step<S, Method, EstimatorDoor>(setup.estimators[which]);
  });
  return step;
}

template <class S>
RecordedStep<S> record_controller(const RunSetup& setup) {
  RecordedStep<S> step;
  int index = 0;
  each_controller_method([&]<class Method>() {
    if (index++ == setup.shape.control.controller.index)
      step = record_step<S, Method, ControllerDoor>(setup.controller);
  });
  return step;
}

std::string machine_of(const Scenario& s) {
  const MachineSettings& m = s.machine;
  return fmt::format("{:.4g} kW, {:.4g} V, {:.4g} A, {:.4g} Hz, {:.5g} rpm, {} pole pairs", m.rated_power_W / 1e3,
                     m.rated_line_voltage_V, m.rated_current_A, m.rated_frequency_Hz, m.rated_speed_rpm, m.pole_pairs);
}

ExportOrigin origin_of(const Scenario& s, const ExportRequest& request) {
  ExportOrigin origin;
  origin.scenario = s.path.substr(s.path.find_last_of('/') + 1);
  origin.title = s.title;
  origin.version = request.version;
  origin.machine = machine_of(s);
  origin.control_period_s = s.run.control_period_s;
  return origin;
}

// The replay must tell the run's own answers: else it is not the step that ran. A run-in lies before a steady start's first tick.
template <class S>
void demand_same_step(RecordedStep<S>& step, const DoorTraffic& traffic, const std::string& name) {
  constexpr std::size_t compared = 2000;
  for (std::size_t k = 0; k < std::min(compared, traffic.ticks()); ++k) {
    const std::vector<S> got = step.replay->step(traffic.seen(k));
    for (std::size_t i = 0; i < got.size(); ++i) {
      const double there = traffic.answered(k)[i], here = static_cast<double>(got[i]);
      if (std::bit_cast<std::uint64_t>(here) != std::bit_cast<std::uint64_t>(there) && here == here)
        throw std::logic_error("the replay of '" + name + "' differs from the run at tick " + std::to_string(k));
    }
  }
}

template <class S>
std::vector<ExportedPart> parts_of(const Scenario& s, const std::vector<std::size_t>& estimators, bool controller,
                                   const ExportOrigin& common) {
  const RunSetup setup = prepare_run(s, 0, 0);
  Traffic traffic;
  RunObserver* const observers[] = {&traffic};
  const RunOutcome outcome = simulate(s, observers);
  if (outcome.diverged)
    throw UnfitForExport(
        fmt::format("the run diverged at {:.4g} s ({}): nothing that diverges in simulation goes onto a "
                    "board; tune first, then export",
                    outcome.diverged_at_s, outcome.diverged_what));
  std::vector<ExportedPart> parts;
  const auto add = [&](const std::string& name, const std::string& kind, bool is_controller, auto record,
                       const DoorTraffic& door) {
    ExportedPart part;
    part.name = c_identifier(name), part.kind = kind, part.is_controller = is_controller;
    ExportOrigin origin = common;
    origin.name = part.name, origin.kind = kind, origin.what = is_controller ? "controller" : "estimator";
    if (s.run.start != "steady") {
      RecordedStep<S> again = record();
      demand_same_step(again, door, name);
    }
    RecordedStep<S> step = record();
    write_c_files(part, step, door, origin);
    parts.push_back(std::move(part));
  };
  if (controller)
    add(
        "controller", s.controller.kind, true, [&] { return record_controller<S>(setup); }, traffic.controller);
  for (const std::size_t i : estimators)
    add(
        s.estimators[i].name, s.estimators[i].kind, false, [&] { return record_estimator<S>(setup, i); },
        traffic.estimators[i]);
  return parts;
}

[[noreturn]] void refuse(const Scenario& s, const std::string& key, const std::string& message) {
  throw InputError(s.path, key, message, "export");
}

}  // namespace

std::vector<ExportedPart> export_parts(const Scenario& scenario, const ExportRequest& request) {
  Scenario s = scenario;
  const bool all = request.estimators.empty() && !request.controller;
  std::vector<std::string> names;
  for (EstimatorSettings& e : s.estimators) {
    names.push_back(e.name);
    e.precision = request.precision == Precision::single ? "float" : "double";
    if (!is_built_in_estimator(e.kind))
      refuse(s, "estimator", "only built-in kinds can be exported, and '" + e.kind + "' is not");
    if (all && e.name == "controller")
      refuse(s, "estimator", "an estimator named 'controller' would get the controller's files: give it another name");
  }
  s.controller.precision = request.precision == Precision::single ? "float" : "double";
  std::vector<std::size_t> estimators;
  for (const std::string& wanted : request.estimators) {
    const auto found = std::find(names.begin(), names.end(), wanted);
    if (found == names.end())
      refuse(s, "estimator",
             fmt::format("no estimator is named '{}'; there are: {}", wanted,
                         names.empty() ? "none" : fmt::format("{}", fmt::join(names, ", "))));
    estimators.push_back(static_cast<std::size_t>(found - names.begin()));
  }
  if (all) {
    for (std::size_t i = 0; i < names.size(); ++i) estimators.push_back(i);
  }
  const bool has_controller = !s.controller.kind.empty();
  if (request.controller && !has_controller)
    refuse(s, "controller", "this scenario has no controller to export: it runs on the mains");
  if (has_controller && !is_built_in_controller(s.controller.kind))
    refuse(s, "controller.kind", "only built-in kinds can be exported, and '" + s.controller.kind + "' is not");
  if (estimators.empty() && !has_controller)
    refuse(s, "estimator", "nothing to export: no estimator and no controller");
  const bool controller = request.controller || (all && has_controller);
  const ExportOrigin origin = origin_of(s, request);
  return request.precision == Precision::single ? parts_of<float>(s, estimators, controller, origin)
                                                : parts_of<double>(s, estimators, controller, origin);
}

}  // namespace slipbench
