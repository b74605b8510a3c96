// More for the tests of gains: diagonals, relative distances, plants whose states are all measured.
#pragma once

#include "tests/plant/linear/matrices.hpp"

namespace slipbench::linear {

inline Matrix diagonal(std::initializer_list<double> values) {
  Matrix m = Matrix::Zero(static_cast<Eigen::Index>(values.size()), static_cast<Eigen::Index>(values.size()));
  Eigen::Index i = 0;
  for (const double value : values) m(i, i) = value, ++i;
  return m;
}

inline double relative(const Matrix& found, const Matrix& wanted) {
  return (found - wanted).norm() / (wanted.norm() > 0.0 ? wanted.norm() : 1.0);
}

inline System seen_whole(const Matrix& A, const Matrix& B, double period_s = 0.0) {
  return system_of(A, B, Matrix::Identity(A.rows(), A.rows()), period_s);
}

}  // namespace slipbench::linear
