// Small helpers of the linear tests: matrices from rows, relative distances.
#pragma once

#include <initializer_list>

#include "plant/linear/system.hpp"

namespace slipbench::linear {

inline Matrix rows(std::initializer_list<std::initializer_list<double>> given) {
  Matrix m(static_cast<Eigen::Index>(given.size()), static_cast<Eigen::Index>(given.begin()->size()));
  Eigen::Index i = 0;
  for (const auto& row : given) {
    Eigen::Index j = 0;
    for (const double value : row) m(i, j++) = value;
    ++i;
  }
  return m;
}

inline Matrix diagonal(std::initializer_list<double> given) {
  Matrix m = Matrix::Zero(static_cast<Eigen::Index>(given.size()), static_cast<Eigen::Index>(given.size()));
  Eigen::Index i = 0;
  for (const double value : given) m(i, i) = value, ++i;
  return m;
}

inline double relative(const Matrix& found, const Matrix& wanted) {
  return (found - wanted).norm() / (wanted.norm() > 0.0 ? wanted.norm() : 1.0);
}

// A system whose outputs are its states.
inline System seen_whole(const Matrix& A, const Matrix& B, double sample_period_s = 0.0) {
  return {A, B, Matrix::Identity(A.rows(), A.rows()), Matrix::Zero(A.rows(), B.cols()), sample_period_s, {}, {}, {}};
}

template <class F>
std::string refusal_of(F&& f) {
  try {
    f();
  } catch (const LinearError& e) {
    return e.what();
  }
  return "not refused";
}

}  // namespace slipbench::linear
