#include "plant/linear/minimal.hpp"

#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <Eigen/QR>
#include <algorithm>

#include "plant/linear/decomposition.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/schur.hpp"
#include "plant/linear/transfer.hpp"

namespace slipbench::linear {
namespace {

// A sentence for each pole of a block of the form; direction(v) is where an eigenvector of the block lies among the states.
void tell(const System& given, const Matrix& block, const Matrix& directions, const char* why,
          std::vector<std::string>* removed) {
  if (block.rows() == 0) return;
  const Eigenpairs of = eigenpairs(block);
  for (Eigen::Index i = 0; i < block.rows(); ++i) {
    const Complex p = of.values(i);
    if (p.imag() < 0.0) continue;
    const Eigen::VectorXcd v = directions.cast<Complex>() * of.vectors.col(i);
    Vector weight = v.real();
    if (p.imag() != 0.0) weight = (v.real().array().square() + v.imag().array().square()).sqrt();
    removed->push_back("pole " + text_of(p) + (p.imag() != 0.0 ? " and its conjugate in " : " in ") +
                       direction_text(given, weight) + ": " + why);
  }
}

// Old states that can serve as the new ones: no part left out reaches into them, and they span what is kept. Empty if
// there are none, or if they would be a much worse choice than orthogonal ones.
std::vector<Eigen::Index> states_to_keep(const Matrix& kept, const Matrix& hidden, double tolerance) {
  const auto r = kept.cols();
  std::vector<Eigen::Index> clean, chosen;
  for (Eigen::Index i = 0; i < kept.rows(); ++i)
    if (hidden.row(i).norm() <= tolerance) clean.push_back(i);
  if (r == 0 || static_cast<Eigen::Index>(clean.size()) < r) return {};
  const Matrix rows = kept(clean, Eigen::all);
  const Eigen::ColPivHouseholderQR<Matrix> qr(rows.transpose());
  for (Eigen::Index k = 0; k < r; ++k)
    chosen.push_back(clean[static_cast<std::size_t>(qr.colsPermutation().indices()(k))]);
  std::sort(chosen.begin(), chosen.end());
  if (condition_number(kept(chosen, Eigen::all)) > 100.0) return {};
  return chosen;
}

}  // namespace

Minimal minimal(const System& given) {
  const auto n = given.order();
  const KalmanForm form = kalman_form(given);
  const auto r = form.controllable_observable, c = form.controllable_only, o = form.observable_only,
             rest = form.neither;
  if (r == n) return {given, {}, Matrix::Identity(n, n), Matrix::Identity(n, n), {}, 0.0, form.warning};
  Minimal out;
  out.warning = form.warning;
  const Vector inverse = form.unit.cwiseInverse();
  const Matrix t = inverse.asDiagonal() * form.T, kept = t.leftCols(r);
  out.system = given;
  out.system.A = form.system.A.topLeftCorner(r, r);
  out.system.B = form.system.B.topRows(r);
  out.system.C = form.system.C.leftCols(r);
  out.system.state_names.clear();
  Matrix turn = Matrix::Identity(r, r), back = turn;
  if (const auto chosen = states_to_keep(kept, t.middleCols(r, c), form.tolerance); !chosen.empty()) {
    turn = form.unit(chosen).asDiagonal() * kept(chosen, Eigen::all);
    back = turn.fullPivLu().inverse();
    out.system.A = turn * out.system.A * back;
    out.system.B = turn * out.system.B;
    out.system.C = out.system.C * back;
    for (const auto i : chosen) out.system.state_names.push_back(given.state_name(i));
  } else {
    for (Eigen::Index k = 1; k <= r; ++k) out.system.state_names.push_back("r" + std::to_string(k));
  }
  out.L = turn * kept.transpose() * inverse.asDiagonal();
  out.R = form.unit.asDiagonal() * kept * back;
  const Matrix& a = form.system.A;
  tell(given, a.block(r, r, c, c), t.middleCols(r, c), "no output shows it", &out.removed);
  const Matrix rows = t.fullPivLu().inverse().middleRows(r + c, o);
  tell(given, a.block(r + c, r + c, o, o).transpose(), rows.transpose(), "no input moves it", &out.removed);
  tell(given, a.bottomRightCorner(rest, rest), t.rightCols(rest), "no input moves it and no output shows it",
       &out.removed);
  out.residual = transfer_difference(given, out.system);
  if (out.residual > 1e-8)
    out.warning += (out.warning.empty() ? "" : "; ") +
                   std::string("the transfer function changed by more than 1e-8 of itself: see the residual");
  return out;
}

}  // namespace slipbench::linear
