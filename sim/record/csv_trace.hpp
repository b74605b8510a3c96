// Trace of a run as CSV: one header line, one line per trace_period_s, each number in the shortest text that reads back
// the same, `nan` for none. The file appears under its name when the run is over, also if it diverged or was stopped.
#pragma once

#include <string>

#include "sim/record/out_file.hpp"
#include "sim/record/trace.hpp"

namespace slipbench {

// Appends the shortest text that reads back the same number; "nan", "inf", "-inf" for the rest.
void append_number(std::string& text, double number);

class CsvTrace : public Trace {
 public:
  explicit CsvTrace(const std::string& path) : file_(path) {}  // throws OutsideError
  void begin(const RunInfo& info) override;
  void trace_row(const RowView& view) override;

  [[nodiscard]] bool failed() const override { return file_.failed(); }
  void finish() override { file_.finish(); }

 private:
  OutFile file_;
  std::string line_;
};

}  // namespace slipbench
