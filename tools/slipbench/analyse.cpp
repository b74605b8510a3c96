// analyse: what a linear system is, read from a state-space file or linearised from a drive.
#include <fmt/format.h>

#include <memory>

#include "sim/record/out_file.hpp"
#include "sim/scenario/system_file.hpp"
#include "tools/slipbench/analyse_drive.hpp"
#include "tools/slipbench/analysis.hpp"
#include "tools/slipbench/linear_json.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace {

Analysis of_system_file(const Request& request) {
  const SystemFile file = read_system_file(request.file, request.overrides);
  if (request.period_s > 0.0 && file.system.discrete())
    throw InputError(
        "command line", "--period",
        "--period: the system is discrete already, sampled every " + fmt::format("{:g} s", file.system.sample_period_s),
        "usage");
  Analysis a = analyse(file.system, request.period_s, request.at_Hz);
  a.title = file.title, a.what = "state-space file";
  a.redundant = file.redundant;
  return a;
}

}  // namespace

int analyse_verb(const Request& request) {
  const FileKind kind = kind_of_file(request.file);
  const bool drive = kind == FileKind::scenario || kind == FileKind::machine;
  if (kind != FileKind::system && !drive)
    throw InputError(request.file, "",
                     "analyse wants a state-space file (one with [system]), a scenario or a machine file; this is " +
                         kind_text(kind),
                     "kind");
  if (request.seed && kind != FileKind::scenario)
    throw InputError("command line", "--seed", "--seed means nothing for " + kind_text(kind), "usage");
  if (!request.map.empty() && !drive)
    throw InputError("command line", "--map", "--map wants a scenario or a machine file; this is " + kind_text(kind),
                     "usage");
  if (!request.map.empty()) return map_of_drive(request, kind);
  std::unique_ptr<OutFile> figure;
  if (!request.figure.empty()) figure = std::make_unique<OutFile>(request.figure);
  try {
    const Analysis a = drive ? analysis_of_drive(request, kind) : of_system_file(request);
    if (figure) {
      figure->write(analysis_figure(a));
      figure->finish();
    }
    if (request.json) {
      print(linear_json(a));
    } else if (!request.quiet) {
      print(analysis_report(a) + (figure ? fmt::format("figure: {}\n", request.figure) : ""));
    }
  } catch (const linear::LinearError& error) {
    throw InputError(request.file, "system", error.what(), "linear");
  }
  return ExitStatus::done;
}

}  // namespace slipbench
