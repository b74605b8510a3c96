#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <algorithm>
#include <cstdio>

#include "plant/linear/balance.hpp"
#include "plant/linear/decomposition.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/poles.hpp"
#include "plant/linear/schur.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

// Real and imaginary part of a unit eigenvector, turned so that they are at right angles: the best conditioned pair.
Matrix real_pair(const Eigen::VectorXcd& v) {
  const Vector re = v.real(), im = v.imag();
  const double angle = 0.5 * slipbench::atan2(-2.0 * re.dot(im), re.squaredNorm() - im.squaredNorm());
  const Complex turn = unit_at(angle);
  Matrix pair(v.size(), 2);
  pair.col(0) = re * turn.real() - im * turn.imag();
  pair.col(1) = re * turn.imag() + im * turn.real();
  return pair;
}

}  // namespace

Modal modal_form(const System& given) {
  const auto n = given.order();
  Modal out{given, Matrix::Identity(n, n), 1.0, ""};
  out.system.state_names.clear();
  for (Eigen::Index i = 0; i < n; ++i) out.system.state_names.push_back("mode" + std::to_string(i + 1));
  if (n == 0) return out;
  for (const PoleGroup& g : pole_groups(given.A))
    if (g.eigenvectors < g.count)
      throw LinearError("there is no modal form: pole " + text_of(g.pole) + " comes " + std::to_string(g.count) +
                        " times with " + std::to_string(g.eigenvectors) +
                        " eigenvector(s), and the condition of the modes would be beyond double precision");
  const Vector unit = in_balanced_units(given).state, inverse = unit.cwiseInverse();
  const Eigenpairs of = eigenpairs(inverse.asDiagonal() * given.A * unit.asDiagonal());
  std::vector<Eigen::Index> order;
  for (Eigen::Index i = 0; i < n; ++i)
    if (of.values(i).imag() >= 0.0) order.push_back(i);
  std::stable_sort(order.begin(), order.end(),
                   [&](Eigen::Index i, Eigen::Index j) { return of.values(i).real() > of.values(j).real(); });
  Matrix t = Matrix::Zero(n, n), a = Matrix::Zero(n, n);
  Eigen::Index at = 0;
  for (const auto i : order) {
    const Complex p = of.values(i);
    a(at, at) = p.real();
    if (p.imag() == 0.0) {
      t.col(at++) = of.vectors.col(i).real().normalized();
      continue;
    }
    t.middleCols(at, 2) = real_pair(of.vectors.col(i).normalized());
    a.block(at, at, 2, 2) << p.real(), p.imag(), -p.imag(), p.real();
    at += 2;
  }
  out.condition = condition_number(t);
  if (out.condition > 1e6) {
    char text[160];
    std::snprintf(
        text, sizeof text, "the modes are nearly parallel (condition %.1e): B and C in modal form keep about %d digits",
        out.condition, std::max(0, static_cast<int>(16.0 - slipbench::log(out.condition) / slipbench::log(10.0))));
    out.warning = text;
  }
  out.T = unit.asDiagonal() * t;
  out.system.A = a;
  out.system.B = t.fullPivLu().solve(inverse.asDiagonal() * given.B);
  out.system.C = given.C * out.T;
  return out;
}

}  // namespace slipbench::linear
