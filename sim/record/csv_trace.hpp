// Trace of a run as CSV: one header line, one line per trace_period_s, each number in the shortest text that reads back
// the same, `nan` for none. The file appears under its name when the run is over, also if it diverged or was stopped.
#pragma once

#include <string>

#include "sim/engine/observer.hpp"
#include "sim/record/out_file.hpp"

namespace slipbench {

// Appends the shortest text that reads back the same number; "nan", "inf", "-inf" for the rest.
void append_number(std::string& text, double number);

class CsvTrace : public RunObserver {
 public:
  explicit CsvTrace(const std::string& path) : file_(path) {}  // throws OutsideError
  void begin(const RunInfo& info) override;
  void trace_row(const RowView& view) override;

  [[nodiscard]] bool failed() const { return file_.failed(); }  // a full disk, say: worth stopping for
  void finish() { file_.finish(); }                             // throws OutsideError
  [[nodiscard]] std::int64_t rows() const { return rows_; }
  [[nodiscard]] std::size_t columns() const { return columns_; }

 private:
  OutFile file_;
  std::string line_;
  std::int64_t rows_ = 0;
  std::size_t columns_ = 0;
};

}  // namespace slipbench
