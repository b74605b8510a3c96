#include "plant/linear/lqr.hpp"

#include <Eigen/Dense>

#include "plant/linear/pbh.hpp"
#include "plant/linear/reference_gain.hpp"
#include "plant/linear/riccati.hpp"
#include "plant/linear/weights.hpp"

namespace slipbench::linear {

StateFeedback lqr(const System& given, const Matrix& Q, const Matrix& R, const Matrix& N) {
  const auto s = checked(given);
  expect_weight("Q", Q, s.order());
  expect_weight("R", R, s.inputs());
  s.discrete() ? expect_semidefinite("R", R) : expect_definite("R", R);
  std::string why;
  if (!stabilisable(s, &why)) throw LinearError("no state feedback stabilises the system: " + why);
  if (s.inputs() > 0 && smallest_eigenvalue(R) > 0.0) {
    // With the cross term taken into the input, u = v - R^-1 N'x, the weight on x is Q - N R^-1 N' and the plant A - B R^-1 N'.
    Matrix A = s.A, seen = Q;
    if (N.rows() == s.order() && N.cols() == s.inputs()) {
      const Matrix shift = R.ldlt().solve(N.transpose());
      A -= s.B * shift;
      seen -= N * shift;
    }
    refuse_unseen_limit(A, seen, s.discrete(), "is seen neither by Q nor by N", s);
  }
  const auto r = s.discrete() ? dare(s.A, s.B, Q, R, N) : care(s.A, s.B, Q, R, N);
  return {r.K, r.X, r.closed_loop_poles, r.condition, r.residual, r.warning};
}

System with_integrals(const System& given) {
  auto s = checked(given);
  const auto n = s.order(), p = s.outputs(), m = s.inputs();
  const double step = s.discrete() ? s.sample_period_s : 1.0;
  System result;
  result.sample_period_s = s.sample_period_s;
  result.A = Matrix::Zero(n + p, n + p);
  result.A << s.A, Matrix::Zero(n, p), -step * s.C, (s.discrete() ? 1.0 : 0.0) * Matrix::Identity(p, p);
  result.B.resize(n + p, m);
  result.B << s.B, -step * s.D;
  result.C = Matrix::Zero(2 * p, n + p);
  result.C << s.C, Matrix::Zero(p, p), Matrix::Zero(p, n), Matrix::Identity(p, p);
  result.D = Matrix::Zero(2 * p, m);
  result.D.topRows(p) = s.D;
  for (Eigen::Index i = 0; i < n; ++i) result.state_names.push_back(s.state_name(i));
  for (Eigen::Index i = 0; i < m; ++i) result.input_names.push_back(s.input_name(i));
  for (Eigen::Index i = 0; i < p; ++i) result.output_names.push_back(s.output_name(i));
  for (Eigen::Index i = 0; i < p; ++i) {
    result.state_names.push_back("integral of " + s.output_name(i) + "'s error");
    result.output_names.push_back(result.state_names.back());
  }
  return result;
}

StateFeedback lqr_with_integral(const System& given, const Matrix& Q, const Matrix& R) {
  const auto s = checked(given);
  refuse_unsteerable(s, "integral action");
  return lqr(with_integrals(s), Q, R);
}

}  // namespace slipbench::linear
