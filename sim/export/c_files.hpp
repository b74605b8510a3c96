// An exported step as text: header, source, vectors, replay.
#pragma once

#include "sim/export/exported.hpp"
#include "sim/export/recorded_step.hpp"
#include "sim/export/traffic.hpp"

namespace slipbench {

// What the files say of where they come from.
struct ExportOrigin {
  std::string name, kind, what;  // of the part; "estimator" or "controller"
  std::string scenario, title, version, machine;
  double control_period_s = 0.0;
};

// Fills `part` with files and figures. Throws UnfitForExport where an answer is not finite.
template <class S>
void write_c_files(ExportedPart& part, RecordedStep<S>& step, const DoorTraffic& traffic, const ExportOrigin& origin);

// NAME_vectors.h, from a replay of the traffic; NAME_replay.c is the same for every part but for the name of that file.
template <class S>
std::string vectors_text(ExportedPart& part, RecordedStep<S>& step, const DoorTraffic& traffic,
                         const ExportOrigin& origin);
std::string replay_text(const ExportOrigin& origin);

// Lines of at most `width` columns, each after `lead`.
std::string wrapped(const std::vector<std::string>& words, const std::string& lead, std::size_t width = 110);
std::string upper_case(std::string text);

}  // namespace slipbench
