#include "sim/record/trace.hpp"

#include "sim/record/csv_trace.hpp"
#include "sim/record/hdf5_trace.hpp"

namespace slipbench {

bool is_hdf5_name(const std::string& path) { return path.ends_with(".h5") || path.ends_with(".hdf5"); }

std::vector<Column> trace_columns(const RunInfo& info) {
  std::vector<Column> all = info.plant;
  all.insert(all.end(), info.measured.begin(), info.measured.end());
  for (const std::string& name : info.estimator_names) {
    const std::vector<Column> five = estimator_columns(name);
    all.insert(all.end(), five.begin(), five.end());
  }
  return all;
}

std::unique_ptr<Trace> open_trace(const std::string& path, const TraceOrigin& origin) {
  if (is_hdf5_name(path)) return std::make_unique<Hdf5Trace>(path, origin);
  return std::make_unique<CsvTrace>(path);
}

}  // namespace slipbench
