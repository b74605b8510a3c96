// check: reads and validates a file, says what it is and what follows from its numbers.
#include <fmt/format.h>

#include <cmath>

#include "plant/steady_state.hpp"
#include "sim/engine/simulate.hpp"
#include "sim/scenario/system_file.hpp"
#include "sim/sweep/plan.hpp"
#include "tools/slipbench/json_out.hpp"
#include "tools/slipbench/table.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

constexpr double pi = 3.14159265358979323846;

double length(const Vec2<double>& v) { return std::sqrt(v.x * v.x + v.y * v.y); }

// What the circuit says of itself, and of the operating point on the nameplate.
void add_machine_facts(std::vector<Fact>& facts, const MachineSettings& machine) {
  const Circuit<double> c = machine.circuit();
  const Nameplate plate = machine.nameplate();
  const double L_s = c.stator_inductance(), L_r = c.rotor_inductance(), L_m = c.magnetizing_inductance;
  const double sigma = 1.0 - L_m * L_m / (L_s * L_r), w = plate.angular_frequency();
  const double slip = 1.0 - plate.speed_rad_s() * c.pole_pairs / w;
  const SteadyState rated = steady_at_slip(c, plate.phase_peak_V(), w, slip);
  const SteadyState idle = steady_at_slip(c, plate.phase_peak_V(), w, 0.0);
  const SteadyState pull_out = steady_at_slip(c, plate.phase_peak_V(), w, pull_out_slip(c, w));
  const double power_in = 1.5 * (rated.voltage.x * rated.current.x + rated.voltage.y * rated.current.y);
  const auto add = [&](const char* key, const char* label, double value, const char* unit) {
    facts.push_back({key, label, value, "", unit});
  };
  add("leakage_factor", "leakage factor, sigma", sigma, "");
  add("transient_inductance_H", "transient inductance, sigma L_s", sigma * L_s, "H");
  add("rotor_time_constant_s", "rotor time constant, L_r / R_r", L_r / c.rotor_resistance, "s");
  add("stator_time_constant_s", "stator time constant, L_s / R_s", L_s / c.stator_resistance, "s");
  add("rated_slip", "slip on the nameplate", slip, "");
  add("rated_rotor_flux_Wb", "rotor flux of the circuit there", length(rated.flux.rotor), "Wb");
  add("circuit_torque_Nm", "torque of the circuit there", rated.torque, "N m");
  add("rated_torque_Nm", "torque on the nameplate", plate.torque_Nm, "N m");
  add("circuit_current_A", "current of the circuit there, rms", length(rated.current) / std::sqrt(2.0), "A");
  add("rated_current_A", "current on the nameplate, rms", plate.current_A, "A");
  add("circuit_power_factor", "power factor of the circuit there",
      power_in / (1.5 * length(rated.voltage) * length(rated.current)), "");
  add("circuit_shaft_power_W", "shaft power of the circuit there", rated.torque * plate.speed_rad_s(), "W");
  add("rated_power_W", "power on the nameplate", plate.power_W, "W");
  add("no_load_current_A", "current of the circuit at no load, rms", length(idle.current) / std::sqrt(2.0), "A");
  add("pull_out_torque_Nm", "pull-out torque of the circuit", pull_out.torque, "N m");
  add("pull_out_speed_rpm", "speed there", pull_out.electrical_speed / c.pole_pairs * 30.0 / pi, "rpm");
}

void add_scenario_facts(std::vector<Fact>& facts, const Scenario& s) {
  const auto add_text = [&](const char* key, const char* label, std::string text) {
    facts.push_back({key, label, 0.0, std::move(text), ""});
  };
  const auto add = [&](const char* key, const char* label, double value, const char* unit) {
    facts.push_back({key, label, value, "", unit});
  };
  add("duration_s", "duration", s.run.duration_s, "s");
  add("plant_step_s", "plant step", s.run.plant_step_s, "s");
  add("control_period_s", "control period", s.run.control_period_s, "s");
  add("trace_rows", "trace rows", std::round(s.run.duration_s / s.run.trace_period_s) + 1.0, "");
  add_text("method", "method", s.run.method);
  add_text("start", "start", s.run.start);
  add("rated_power_W", "machine, rated power", s.machine.rated_power_W, "W");
  add_text("supply", "supply", s.on_mains() ? s.supply.kind : s.supply.kind + ", " + s.supply.model);
  std::vector<std::string> loads, estimators;
  for (const LoadSettings& load : s.loads) loads.push_back(load.kind);
  for (const EstimatorSettings& e : s.estimators) estimators.push_back(fmt::format("{} ({})", e.name, e.kind));
  add_text("loads", "loads", loads.empty() ? "none" : fmt::format("{}", fmt::join(loads, ", ")));
  add_text("speed_sensor", "speed sensor", s.sensors.speed.kind);
  if (!s.controller.kind.empty()) {
    add_text("controller", "controller", fmt::format("{}, speed from {}", s.controller.kind, s.controller.speed_from));
  }
  add_text("estimators", "estimators", estimators.empty() ? "none" : fmt::format("{}", fmt::join(estimators, ", ")));
  add("score_from_s", "scored from", s.score.from_s, "s");
  add("score_to_s", "scored to", s.score.to_s, "s");
}

void add_system_facts(std::vector<Fact>& facts, const SystemFile& file) {
  const linear::System& s = file.system;
  if (!file.source.empty()) facts.push_back({"source", "source of its numbers", 0.0, file.source, ""});
  facts.push_back({"order", "order", static_cast<double>(s.order()), "", ""});
  facts.push_back({"inputs", "inputs", static_cast<double>(s.inputs()), "", ""});
  facts.push_back({"outputs", "outputs", static_cast<double>(s.outputs()), "", ""});
  facts.push_back({"time", "time", 0.0, s.discrete() ? "discrete" : "continuous", ""});
  if (s.discrete()) facts.push_back({"sample_period_s", "sampled every", s.sample_period_s, "", "s"});
  std::vector<std::string> redundant;
  for (const linear::Redundant& r : file.redundant) redundant.push_back(r.variable);
  if (!redundant.empty())
    facts.push_back(
        {"redundant", "redundant in the descriptor form", 0.0, fmt::format("{}", fmt::join(redundant, ", ")), ""});
  facts.push_back({"design", "design", 0.0, file.design ? std::string(name_of(file.design->kind)) : "none", ""});
}

std::string check_summary(const CheckDocument& document) {
  Table table;
  table.column("", "", Table::Align::left);
  table.column("", "", Table::Align::left);
  for (const Fact& fact : document.facts) {
    table.row({fact.label,
               fact.text.empty() ? plain(fact.number, 5) + (fact.unit.empty() ? "" : " " + fact.unit) : fact.text});
  }
  return fmt::format("{}: a valid {}{}\n{}", document.file, document.kind,
                     document.title.empty() ? "" : ", \"" + document.title + "\"", table.text());
}

}  // namespace

int check_verb(const Request& request) {
  if (request.wants_reference()) return print_reference(request);
  const FileKind kind = kind_of_file(request.file);
  CheckDocument document;
  document.file = request.file;
  if (kind == FileKind::scenario) {
    const Scenario scenario = read_scenario(request.file, request.overrides, request.seed);
    check_start(scenario);
    document.kind = "scenario";
    document.title = scenario.title;
    add_scenario_facts(document.facts, scenario);
  } else if (kind == FileKind::machine) {
    if (request.seed) {
      throw InputError("command line", "--seed", "--seed means nothing for a machine file", "usage");
    }
    document.kind = "machine file";
    const MachineSettings machine = read_machine(request.file, request.overrides);
    document.title = machine.title;
    if (!machine.source.empty()) document.facts.push_back({"source", "source of its numbers", 0.0, machine.source, ""});
    add_machine_facts(document.facts, machine);
  } else if (kind == FileKind::plan) {
    document.kind = "sweep plan";
    const SweepPlan plan = read_plan(request.file, request.overrides, request.seed);
    document.title = plan.title;
    document.facts.push_back({"scenario", "scenario", 0.0, plan.scenario, ""});
    document.facts.push_back({"cases", "cases", static_cast<double>(plan.cases()), "", ""});
    document.facts.push_back({"runs", "noise runs of each", static_cast<double>(plan.runs), "", ""});
    document.facts.push_back({"keys", "keys that vary", 0.0, fmt::format("{}", fmt::join(plan.keys(), ", ")), ""});
  } else if (kind == FileKind::gains) {
    document.kind = "gain file";
    document.title = read_gain_file(request.file, request.overrides);
  } else {
    if (request.seed) {
      throw InputError("command line", "--seed", "--seed means nothing for a state-space file", "usage");
    }
    document.kind = "state-space file";
    const SystemFile file = read_system_file(request.file, request.overrides);
    document.title = file.title;
    add_system_facts(document.facts, file);
  }
  if (request.json) {
    print(json_document(document));
  } else if (!request.quiet) {
    print(check_summary(document));
  }
  return ExitStatus::done;
}

}  // namespace slipbench
