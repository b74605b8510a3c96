#include "plant/linear/system.hpp"

#include <cstdio>
#include <utility>

namespace slipbench::linear {
namespace {

std::string named(const std::vector<std::string>& names, Eigen::Index i, char letter) {
  const auto at = static_cast<std::size_t>(i);
  return at < names.size() ? names[at] : letter + std::to_string(i + 1);
}

std::string shape(const Matrix& m) { return std::to_string(m.rows()) + " x " + std::to_string(m.cols()); }

void expect(const char* name, const Matrix& m, Eigen::Index rows, Eigen::Index columns) {
  if (m.rows() != rows || m.cols() != columns)
    throw LinearError(std::string(name) + " is " + shape(m) + ", but must be " + std::to_string(rows) + " x " +
                      std::to_string(columns));
  if (!m.allFinite()) throw LinearError(std::string(name) + " holds a number that is not finite");
}

}  // namespace

std::string System::state_name(Eigen::Index i) const { return named(state_names, i, 'x'); }
std::string System::input_name(Eigen::Index i) const { return named(input_names, i, 'u'); }
std::string System::output_name(Eigen::Index i) const { return named(output_names, i, 'y'); }

System checked(System s) {
  const auto n = s.A.rows(), m = s.B.cols(), p = s.C.rows();
  if (s.D.size() == 0) s.D = Matrix::Zero(p, m);
  expect("A", s.A, n, n);
  expect("B", s.B, n, m);
  expect("C", s.C, p, n);
  expect("D", s.D, p, m);
  return s;
}

std::string text_of(Complex value) {
  char text[64];
  if (value.imag() == 0.0)
    std::snprintf(text, sizeof text, "%.6g", value.real());
  else
    std::snprintf(text, sizeof text, "%.6g %c %.6gj", value.real(), value.imag() < 0.0 ? '-' : '+',
                  value.imag() < 0.0 ? -value.imag() : value.imag());
  return text;
}

}  // namespace slipbench::linear
