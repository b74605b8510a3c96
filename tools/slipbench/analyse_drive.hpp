// analyse on scenarios and machine files: the drive linearised at its operating point, and maps over the torque-speed plane.
#pragma once

#include "tools/slipbench/analysis.hpp"
#include "tools/slipbench/options.hpp"

namespace slipbench {

Analysis analysis_of_drive(const Request& request, FileKind kind);
int map_of_drive(const Request& request, FileKind kind);  // --map; the exit status

}  // namespace slipbench
