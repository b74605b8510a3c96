// design: gains for a plant of a state-space file, and what the loops they make are like.
#include <fmt/format.h>

#include <memory>

#include "sim/record/out_file.hpp"
#include "tools/slipbench/design_drive.hpp"
#include "tools/slipbench/design_result.hpp"
#include "tools/slipbench/linear_json.hpp"
#include "tools/slipbench/verbs.hpp"

namespace slipbench {

int design_verb(const Request& request) {
  const FileKind kind = kind_of_file(request.file);
  if (kind != FileKind::system && kind != FileKind::scenario)
    throw InputError(
        request.file, "",
        "design wants a state-space file (one with [system] and [design]) or a scenario; this is " + kind_text(kind),
        "kind");
  if (kind == FileKind::scenario) {
    for (const bool given : {request.at_Hz > 0.0, !request.figure.empty()}) {
      const char* option = given && request.at_Hz > 0.0 ? "--at" : "--figure";
      if (given) throw InputError("command line", option, std::string(option) + " is for state-space files", "usage");
    }
    return design_of_drive(request);
  }
  if (!request.write.empty())
    throw InputError("command line", "--write", "--write is for scenarios, whose gains a scenario can include",
                     "usage");
  if (request.seed) throw InputError("command line", "--seed", "--seed means nothing for a state-space file", "usage");
  std::unique_ptr<OutFile> figure;
  const DesignResult result = design(read_system_file(request.file, request.overrides), request.at_Hz);
  if (!request.figure.empty()) figure = std::make_unique<OutFile>(request.figure);
  if (figure) {
    try {
      figure->write(design_figure(result));
    } catch (const linear::LinearError& error) {
      throw InputError(request.file, "design", std::string("no picture: ") + error.what(), "linear");
    }
    figure->finish();
  }
  if (request.json) {
    print(linear_json(result));
  } else if (!request.quiet) {
    print(design_report(result) + (figure ? fmt::format("figure: {}\n", request.figure) : ""));
  }
  return ExitStatus::done;
}

}  // namespace slipbench
