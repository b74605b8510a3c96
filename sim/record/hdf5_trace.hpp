// Trace of a run as HDF5, format 1: one float64 dataset a column at the root, `unit` and `meaning` as its attributes; group
// `about` with what it was made from: datasets `scenario` (the file's text) and `overrides` (one `key=value` a line), attributes
// `format`, `slipbench`, `title`, `seed`, `noise_run`, `trace_period_s`. Links keep the order of their creation, which is the
// trace's. NaN for none. The only place that knows HDF5.
#pragma once

#include <string>
#include <vector>

#include "sim/record/out_file.hpp"
#include "sim/record/trace.hpp"

namespace slipbench {

class Hdf5Trace : public Trace {
 public:
  Hdf5Trace(const std::string& path, TraceOrigin origin);  // throws OutsideError; a pipe or device is refused
  ~Hdf5Trace() override;
  Hdf5Trace(const Hdf5Trace&) = delete;
  Hdf5Trace& operator=(const Hdf5Trace&) = delete;

  void begin(const RunInfo& info) override;
  void trace_row(const RowView& view) override;
  [[nodiscard]] bool failed() const override { return failed_; }
  void finish() override;

 private:
  using Handle = std::int64_t;  // hid_t
  static constexpr std::size_t rows_per_block = 1024;

  void check(std::int64_t result);  // negative: HDF5 failed
  void write_about(const RunInfo& info);
  void write_block();
  void close();

  OutFile file_;  // holds the place and takes the final name; HDF5 writes the bytes
  TraceOrigin origin_;
  Handle h5_ = -1;
  std::vector<Handle> datasets_;
  std::vector<double> block_;  // column by column, `rows_per_block` a piece
  std::size_t in_block_ = 0;
  std::string why_;  // what HDF5 told first
  bool failed_ = false;
};

}  // namespace slipbench
