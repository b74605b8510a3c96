#include "sim/record/csv_trace.hpp"

#include <array>
#include <charconv>
#include <cmath>

namespace slipbench {

void append_number(std::string& text, double number) {
  if (std::isnan(number)) {  // the sign and payload of a NaN say nothing
    text += "nan";
    return;
  }
  std::array<char, 32> buffer;
  const auto end = std::to_chars(buffer.data(), buffer.data() + buffer.size(), number).ptr;
  text.append(buffer.data(), end);
}

void CsvTrace::begin(const RunInfo& info) {
  line_.clear();
  const std::vector<Column> columns = info.columns();
  columns_ = columns.size();
  for (const Column& column : columns) line_ += (line_.empty() ? "" : ",") + column.name;
  line_ += '\n';
  file_.write(line_);
}

void CsvTrace::trace_row(const RowView& view) {
  line_.clear();
  const auto add = [&](std::span<const double> numbers) {
    for (const double number : numbers) {
      if (!line_.empty()) line_ += ',';
      append_number(line_, number);
    }
  };
  add(*view.plant);
  add(view.measured);
  add(view.estimates);
  line_ += '\n';
  file_.write(line_);
  ++rows_;
}

}  // namespace slipbench
