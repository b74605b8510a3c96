// Progress of a library's long work, told on standard error, and whether it may go on.
#pragma once

#include <functional>
#include <string>

namespace slipbench {

// Called with the share done, from any thread; false once interrupted. asked, quiet: as in progress.hpp.
std::function<bool(double)> told_progress(const std::string& what, bool asked, bool quiet);

}  // namespace slipbench
