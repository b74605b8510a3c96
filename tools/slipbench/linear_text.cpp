#include "tools/slipbench/linear_text.hpp"

#include <fmt/format.h>

#include "tools/slipbench/table.hpp"

namespace slipbench {

namespace {

template <class Name>
std::vector<std::string> names(Eigen::Index count, Name&& name) {
  std::vector<std::string> all;
  for (Eigen::Index i = 0; i < count; ++i) all.push_back(name(i));
  return all;
}

}  // namespace

std::vector<std::string> state_names(const linear::System& s) {
  return names(s.order(), [&](Eigen::Index i) { return s.state_name(i); });
}
std::vector<std::string> input_names(const linear::System& s) {
  return names(s.inputs(), [&](Eigen::Index i) { return s.input_name(i); });
}
std::vector<std::string> output_names(const linear::System& s) {
  return names(s.outputs(), [&](Eigen::Index i) { return s.output_name(i); });
}

std::string named_table(const linear::Matrix& m, const std::vector<std::string>& rows,
                        const std::vector<std::string>& columns) {
  Table t;
  t.column("", "", Table::Align::left);
  for (const std::string& column : columns) t.column(column, "");
  for (Eigen::Index i = 0; i < m.rows(); ++i) {
    std::vector<std::string> cells = {rows[static_cast<std::size_t>(i)]};
    for (Eigen::Index j = 0; j < m.cols(); ++j) cells.push_back(plain(m(i, j), 5));
    t.row(std::move(cells));
  }
  return t.text();
}

std::string matrix_table(const linear::Matrix& gain, const linear::System& s) {
  return named_table(gain, output_names(s), input_names(s));
}

std::string gain_phase_table(const linear::FrequencyPoint& point, const linear::System& s) {
  Table t;
  t.column("from", "", Table::Align::left);
  t.column("to", "", Table::Align::left);
  t.column("gain", "");
  t.column("phase", "deg");
  for (Eigen::Index j = 0; j < s.inputs(); ++j) {
    for (Eigen::Index i = 0; i < s.outputs(); ++i) {
      t.row({s.input_name(j), s.output_name(i), significant(point.gain(i, j), 5),
             significant(point.phase_rad(i, j) * 57.29577951308232, 4)});
    }
  }
  return t.text();
}

}  // namespace slipbench
