// Matrices written as rows, for tests of linear systems.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

inline Matrix rows(std::initializer_list<std::initializer_list<double>> values) {
  Matrix m(static_cast<Eigen::Index>(values.size()),
           values.size() ? static_cast<Eigen::Index>(values.begin()->size()) : 0);
  Eigen::Index i = 0;
  for (const auto& row : values) {
    Eigen::Index j = 0;
    for (const double x : row) m(i, j++) = x;
    ++i;
  }
  return m;
}

inline System system_of(const Matrix& A, const Matrix& B, const Matrix& C, double period_s = 0.0) {
  System s;
  s.A = A;
  s.B = B;
  s.C = C;
  s.sample_period_s = period_s;
  return checked(s);
}

// No inputs, no outputs.
inline System free_system(const Matrix& A, double period_s = 0.0) {
  return system_of(A, Matrix(A.rows(), 0), Matrix(0, A.rows()), period_s);
}

// The sentence of the LinearError that `f` throws; empty when it throws none.
template <class F>
std::string refusal(F&& f) {
  try {
    f();
  } catch (const LinearError& error) {
    return error.what();
  }
  return "";
}

}  // namespace slipbench::linear
