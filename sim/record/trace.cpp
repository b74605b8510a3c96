#include "sim/record/trace.hpp"

#include "sim/record/csv_trace.hpp"
#include "sim/record/hdf5_trace.hpp"

namespace slipbench {

bool is_hdf5_name(const std::string& path) { return path.ends_with(".h5") || path.ends_with(".hdf5"); }

std::unique_ptr<Trace> open_trace(const std::string& path, const TraceOrigin& origin) {
  if (is_hdf5_name(path)) return std::make_unique<Hdf5Trace>(path, origin);
  return std::make_unique<CsvTrace>(path);
}

}  // namespace slipbench
