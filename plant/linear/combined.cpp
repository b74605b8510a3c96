#include "plant/linear/combined.hpp"

#include "plant/linear/dense.hpp"
#include "plant/linear/pole_set.hpp"

namespace slipbench::linear {
namespace {

using Index = Eigen::Index;

void expect_shape(const char* name, const Matrix& m, Index rows, Index columns) {
  if (m.rows() != rows || m.cols() != columns)
    throw LinearError(std::string(name) + " is " + std::to_string(m.rows()) + " x " + std::to_string(m.cols()) +
                      ", but must be " + std::to_string(rows) + " x " + std::to_string(columns));
}

// Names and zeros of the right shapes: `states` of them, `references` inputs r.
System frame(const System& s, Index states, Index references) {
  const auto m = s.inputs(), p = s.outputs();
  System f;
  f.sample_period_s = s.sample_period_s;
  f.A = Matrix::Zero(states, states);
  f.B = Matrix::Zero(states, references + m + p);
  f.C = Matrix::Zero(p + m, states);
  f.D = Matrix::Zero(p + m, references + m + p);
  for (Index i = 0; i < s.order(); ++i) f.state_names.push_back(s.state_name(i));
  for (Index i = 0; i < references; ++i)
    f.input_names.push_back("reference of " + (references == p ? s.output_name(i) : s.input_name(i)));
  for (Index i = 0; i < m; ++i) f.input_names.push_back("disturbance of " + s.input_name(i));
  for (Index i = 0; i < p; ++i) f.input_names.push_back("noise of " + s.output_name(i));
  for (Index i = 0; i < p; ++i) f.output_names.push_back(s.output_name(i));
  for (Index i = 0; i < m; ++i) f.output_names.push_back(s.input_name(i));
  return f;
}

// u = -F x_all + G r, with the plant's states first: fills what all loops share.
System loop(const System& s, const Matrix& F, const Matrix& G) {
  const auto n = s.order(), m = s.inputs(), p = s.outputs(), q = G.cols();
  auto f = frame(s, F.cols(), q);
  f.A.topLeftCorner(n, n) = s.A;
  f.A.topRows(n) -= s.B * F;
  f.B.topLeftCorner(n, q) = s.B * G;
  f.B.block(0, q, n, m) = s.B;
  f.C.topLeftCorner(p, n) = s.C;
  f.C.topRows(p) -= s.D * F;
  f.C.bottomRows(m) = -F;
  f.D.topLeftCorner(p, q) = s.D * G;
  f.D.block(0, q, p, m) = s.D;
  f.D.bottomLeftCorner(m, q) = G;
  return f;
}

}  // namespace

System open_loop(const System& given) {
  const auto s = checked(given);
  return loop(s, Matrix::Zero(s.inputs(), s.order()), Matrix::Identity(s.inputs(), s.inputs()));
}

System feedback_loop(const System& given, const Matrix& K) {
  const auto s = checked(given);
  return referenced_loop(s, K, Matrix::Identity(s.inputs(), s.inputs()));
}

System referenced_loop(const System& given, const Matrix& K, const Matrix& N) {
  const auto s = checked(given);
  expect_shape("K", K, s.inputs(), s.order());
  expect_shape("N", N, s.inputs(), N.cols());
  return loop(s, K, N);
}

System observed_loop(const System& given, const Matrix& K, const Matrix& N, const Matrix& L) {
  const auto s = checked(given);
  const auto n = s.order(), m = s.inputs(), p = s.outputs(), q = N.cols();
  expect_shape("K", K, m, n);
  expect_shape("N", N, m, q);
  expect_shape("L", L, n, p);
  Matrix F = Matrix::Zero(m, 2 * n);
  F.rightCols(n) = K;
  auto f = loop(s, F, N);
  f.A.bottomLeftCorner(n, n) = L * s.C;
  f.A.bottomRightCorner(n, n) = s.A - s.B * K - L * s.C;
  f.B.bottomLeftCorner(n, q) = s.B * N;
  f.B.block(n, q, n, m) = L * s.D;
  f.B.bottomRightCorner(n, p) = L;
  for (Index i = 0; i < n; ++i) f.state_names.push_back("estimate of " + s.state_name(i));
  return f;
}

System integral_loop(const System& given, const Matrix& K) {
  const auto s = checked(given);
  const auto n = s.order(), m = s.inputs(), p = s.outputs();
  expect_shape("K", K, m, n + p);
  auto f = loop(s, K, Matrix::Zero(m, p));
  const double step = s.discrete() ? s.sample_period_s : 1.0;
  f.A.bottomRows(p) = -step * f.C.topRows(p);
  if (s.discrete()) f.A.bottomRightCorner(p, p) += Matrix::Identity(p, p);
  f.B.bottomRows(p) = -step * f.D.topRows(p);
  f.B.bottomLeftCorner(p, p) += step * Matrix::Identity(p, p);
  f.B.bottomRightCorner(p, p) -= step * Matrix::Identity(p, p);
  for (Index i = 0; i < p; ++i) f.state_names.push_back("integral of " + s.output_name(i) + "'s error");
  return f;
}

Separation separation(const System& given, const Matrix& K, const Matrix& L) {
  const auto s = checked(given);
  Separation r;
  r.combined = eigenvalues(observed_loop(s, K, Matrix::Zero(s.inputs(), 0), L).A);
  r.controller = eigenvalues(s.A - s.B * K);
  r.observer = eigenvalues(s.A - L * s.C);
  auto both = r.controller;
  both.insert(both.end(), r.observer.begin(), r.observer.end());
  r.distance = pole_distance(both, r.combined);
  return r;
}

}  // namespace slipbench::linear
