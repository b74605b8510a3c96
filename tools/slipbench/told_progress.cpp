#include "tools/slipbench/told_progress.hpp"

#include <memory>

#include "tools/slipbench/interrupt.hpp"
#include "tools/slipbench/progress.hpp"

namespace slipbench {

std::function<bool(double)> told_progress(const std::string& what, bool asked, bool quiet) {
  auto progress = std::make_shared<Progress>(what, asked, quiet);
  return [progress](double done) {
    progress->update(done);
    return !interrupted();
  };
}

}  // namespace slipbench
