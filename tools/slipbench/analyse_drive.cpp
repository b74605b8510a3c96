#include "tools/slipbench/analyse_drive.hpp"

#include "sim/engine/columns.hpp"
#include "sim/linear/operating_point.hpp"

namespace slipbench {

namespace {

void take(Analysis& a, const OperatingPoint& point) {
  const std::vector<Column>& columns = plant_columns();
  for (std::size_t i = 0; i < columns.size() && i < point.row.size(); ++i)
    a.operating_point.push_back({std::string(columns[i].name), point.row[static_cast<P>(i)]});
}

linear::System linear_system(const Request& request, const OperatingPoint& point) {
  try {
    return system_at(point);
  } catch (const linear::LinearError& error) {
    throw InputError(request.file, "", error.what(), "linear");
  }
}

}  // namespace

Analysis analysis_of_drive(const Request& request, FileKind kind) {
  if (kind == FileKind::machine) {
    const MachineSettings machine = read_machine(request.file, request.overrides);
    const OperatingPoint point = operating_point(machine);
    Analysis a = analyse(linear_system(request, point), request.period_s, request.at_Hz);
    a.title = machine.title, a.what = "machine on rated mains at rated speed, held there";
    take(a, point);
    return a;
  }
  const Scenario scenario = read_scenario(request.file, request.overrides, request.seed);
  const OperatingPoint point = operating_point(scenario);
  const double period = request.period_s > 0.0 ? request.period_s : scenario.run.control_period_s;
  Analysis a = analyse(linear_system(request, point), period, request.at_Hz);
  a.title = scenario.title;
  a.what = point.speed_held ? "drive in its synchronous frame, speed held" : "drive in its synchronous frame";
  take(a, point);
  return a;
}

}  // namespace slipbench
