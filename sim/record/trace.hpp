// The trace of a run on disk, in the format that the file's ending names: .csv or .h5. The file appears under its name when
// the run is over, also if it diverged or was stopped.
#pragma once

#include <cstdint>
#include <memory>
#include <string>

#include "sim/engine/observer.hpp"

namespace slipbench {

class Trace : public RunObserver {
 public:
  [[nodiscard]] virtual bool failed() const = 0;  // a full disk, say: worth stopping for
  virtual void finish() = 0;                      // throws OutsideError
  [[nodiscard]] std::int64_t rows() const { return rows_; }
  [[nodiscard]] std::size_t columns() const { return columns_; }

 protected:
  std::int64_t rows_ = 0;
  std::size_t columns_ = 0;
};

// What a trace was made from, kept in files that have room for it (HDF5).
struct TraceOrigin {
  std::string version;    // of slipbench
  std::string scenario;   // text of the file
  std::string overrides;  // one `key=value` a line
  std::uint64_t seed = 0;
  std::uint32_t noise_run = 0;
};

// True for names that end in a format's ending.
[[nodiscard]] bool is_hdf5_name(const std::string& path);  // .h5, .hdf5
// CSV for all other names. Throws OutsideError where the file cannot be written.
std::unique_ptr<Trace> open_trace(const std::string& path, const TraceOrigin& origin);

}  // namespace slipbench
