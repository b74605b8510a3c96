#include "plant/linear/zeros.hpp"

#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cmath>
#include <limits>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/minimal.hpp"

namespace slipbench::linear {
namespace {

// Takes states and outputs off until D has full row rank; the finite zeros stay. One step: the rows of C that D does not
// reach hold some combinations of states at zero, and the derivatives of those at zero too.
void reduce_rows(System* s, double tolerance) {
  for (;;) {
    const Svd of_d = svd(s->D);
    const auto reached = (of_d.s.array() > tolerance).count(), free = s->outputs() - reached;
    s->C = Matrix(of_d.U.transpose() * s->C);
    s->D = Matrix(of_d.U.transpose() * s->D);
    const Matrix pins = s->C.bottomRows(free);
    const Svd of_c = svd(pins);
    const auto pinned = (of_c.s.array() > tolerance).count(), n = s->order() - pinned;
    s->C.conservativeResize(reached, Eigen::NoChange);
    s->D.conservativeResize(reached, Eigen::NoChange);
    if (pinned == 0) return;
    // The pinned combinations first in V: put them last.
    Matrix v(s->order(), s->order());
    v << of_c.V.rightCols(n), of_c.V.leftCols(pinned);
    const Matrix a = v.transpose() * s->A * v, b = v.transpose() * s->B, c = s->C * v;
    System next = *s;
    next.A = a.topLeftCorner(n, n);
    next.B = b.topRows(n);
    next.C.resize(reached + pinned, n);
    next.C << c.leftCols(n), a.bottomLeftCorner(pinned, n);
    next.D.resize(reached + pinned, s->inputs());
    next.D << s->D, b.bottomRows(pinned);
    *s = next;
  }
}

System transposed(const System& s) {
  System t = s;
  t.A = s.A.transpose();
  t.B = s.C.transpose();
  t.C = s.B.transpose();
  t.D = s.D.transpose();
  return t;
}

// s where s E - A is singular, for an invertible E.
std::vector<Complex> generalised(const Matrix& a, const Matrix& e) {
  const double size = a.norm() > 0.0 ? a.norm() : 1.0;
  const Eigen::GeneralizedEigenSolver<Matrix> of(a / size, e, false);
  if (of.info() != Eigen::Success) throw LinearError("the zeros did not converge: are all numbers finite?");
  std::vector<Complex> values;
  for (Eigen::Index i = 0; i < a.rows(); ++i)
    if (std::fabs(of.betas()(i)) > std::numeric_limits<double>::min()) {
      const Complex alpha = of.alphas()(i);
      const double beta = of.betas()(i) / size;
      values.emplace_back(alpha.real() / beta, alpha.imag() / beta);
    }
  return values;
}

}  // namespace

std::vector<Complex> invariant_zeros(const System& given) {
  if (given.order() == 0 || given.inputs() == 0 || given.outputs() == 0) return {};
  System s = in_balanced_units(given).system;
  Matrix whole(s.order() + s.outputs(), s.order() + s.inputs());
  whole << s.A, s.B, s.C, s.D;
  const double tolerance = rank_tolerance(whole.rows(), whole.cols()) * whole.norm();
  reduce_rows(&s, tolerance);
  s = transposed(s);
  reduce_rows(&s, tolerance);
  const auto n = s.order(), m = s.inputs();
  if (n == 0) return {};
  // D is square and invertible now. On the null space of [C D] what is left is a pencil of n rows.
  Matrix out(m, n + m), state(n, n + m);
  out << s.C, s.D;
  state << s.A, s.B;
  const Matrix free = svd(out).V.rightCols(n);
  std::vector<Complex> zeros = generalised(state * free, free.topRows(n));
  std::sort(zeros.begin(), zeros.end(), [&](Complex x, Complex y) {
    const double a = given.discrete() ? magnitude(x) : x.real(), b = given.discrete() ? magnitude(y) : y.real();
    return a != b ? a > b : x.imag() > y.imag();
  });
  return zeros;
}

std::vector<Complex> transmission_zeros(const System& system) { return invariant_zeros(minimal(system).system); }

}  // namespace slipbench::linear
