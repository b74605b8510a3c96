#include "plant/linear/kalman.hpp"

#include <Eigen/Dense>

#include "plant/linear/pbh.hpp"
#include "plant/linear/riccati.hpp"
#include "plant/linear/weights.hpp"

namespace slipbench::linear {

Observer stationary_kalman(const System& given, const Matrix& W, const Matrix& V) {
  const auto s = checked(given);
  expect_weight("W", W, s.order());
  expect_weight("V", V, s.outputs());
  expect_semidefinite("W", W);
  s.discrete() ? expect_semidefinite("V", V) : expect_definite("V", V);
  std::string why;
  if (!detectable(s, &why)) throw LinearError("no observer follows every state: " + why);
  if (smallest_eigenvalue(V) > 0.0)
    refuse_unseen_limit(s.A.transpose(), W, s.discrete(), "is driven by no noise in W: its gain would fade to nothing",
                        s);
  const Matrix At = s.A.transpose(), Ct = s.C.transpose();
  const auto r = s.discrete() ? dare(At, Ct, W, V) : care(At, Ct, W, V);
  Observer o;
  o.L = r.K.transpose();
  o.poles = r.closed_loop_poles;
  o.condition = r.condition;
  o.residual = r.residual;
  o.warning = r.warning;
  o.P = r.X;
  if (s.discrete()) {
    const Matrix innovation = s.C * r.X * Ct + V;
    o.M = s.outputs() > 0 ? Matrix(innovation.fullPivLu().solve(s.C * r.X).transpose())
                          : Matrix(Matrix::Zero(s.order(), 0));
    const Matrix kept = Matrix::Identity(s.order(), s.order()) - o.M * s.C;
    o.P_filtered = kept * r.X * kept.transpose() + o.M * V * o.M.transpose();
  }
  return o;
}

}  // namespace slipbench::linear
