// export: estimators and the controller of a scenario as C99, and what they cost on a small board.
#include <fmt/format.h>

#include <filesystem>
#include <memory>

#include "sim/record/out_file.hpp"
#include "tools/slipbench/export_result.hpp"
#include "tools/slipbench/json_out.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

namespace fs = std::filesystem;

namespace {

void write_files(const ExportResult& result) {
  std::error_code failed;
  fs::create_directories(result.folder, failed);
  if (failed) throw OutsideError("cannot make the folder '" + result.folder + "': " + failed.message());
  // All are opened and written before the first takes its name: no folder with half an export.
  std::vector<std::unique_ptr<OutFile>> files;
  for (const ExportedPart& part : result.parts) {
    for (const ExportedFile& file : part.files) {
      files.push_back(std::make_unique<OutFile>((fs::path(result.folder) / file.name).string()));
      files.back()->write(file.text);
    }
  }
  for (const auto& file : files) {
    if (file->failed()) file->finish();
  }
  for (const auto& file : files) file->finish();
}

}  // namespace

int export_verb(const Request& request) {
  want_scenario(request);
  if (request.cost && request.double_precision)
    throw InputError("command line", "--cost",
                     "--cost counts on a Cortex-M4F, which computes in float alone: leave --precision at float",
                     "usage");
  const Scenario scenario = read_scenario(request.file, request.overrides, request.seed);
  if (request.cost) demand_board_tools();

  ExportRequest wanted;
  wanted.version = SLIPBENCH_VERSION;
  wanted.estimators = request.estimators;
  wanted.controller = request.export_controller;
  wanted.precision = request.double_precision ? Precision::twofold : Precision::single;
  ExportResult result;
  result.scenario = request.file;
  result.folder = request.to;
  result.precision = request.double_precision ? "double" : "float";
  result.control_period_s = scenario.run.control_period_s;
  result.band = request.band;
  try {
    result.parts = export_parts(scenario, wanted);
  } catch (const UnfitForExport& unfit) {
    const std::string text = fmt::format("{}: nothing was exported: {}", request.file, unfit.what());
    if (request.json) print(json_document(ErrorDocument{request.file, "", text, "unfit"}));
    std::fputs((text + "\n").c_str(), stderr);
    return ExitStatus::bad_result;
  }
  if (request.cost) {
    for (const ExportedPart& part : result.parts) result.costs.push_back(cost_on_board(part));
  }
  write_files(result);
  if (request.json) {
    print(json_document(result));
  } else if (!request.quiet) {
    print(export_summary(result));
  }
  return ExitStatus::done;
}

}  // namespace slipbench
