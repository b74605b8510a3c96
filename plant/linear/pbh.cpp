#include "plant/linear/pbh.hpp"

#include <algorithm>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/poles.hpp"
#include "plant/linear/staircase.hpp"

namespace slipbench::linear {
namespace {

double smallest_beside(const Matrix& a, Complex pole, double size, const Matrix& b) {
  const auto n = a.rows();
  ComplexMatrix beside(n, n + b.cols());
  beside.leftCols(n) = a.cast<Complex>();
  beside.leftCols(n).diagonal().array() -= pole;
  beside.leftCols(n) /= size;
  const double b_size = largest_singular_value(b);
  beside.rightCols(b.cols()) = (b_size > 0.0 ? Matrix(b / b_size) : b).cast<Complex>();
  return singular_values(beside)(n - 1);
}

// The part that can't be reached (seen) holds `left` modes: the worst of them decides.
bool harmless(const Matrix& left, double period_s, const char* cannot, std::string* why) {
  const System rest{left, Matrix(left.rows(), 0), Matrix(0, left.rows()), Matrix(0, 0), period_s, {}, {}, {}};
  const Verdict verdict = stability_of(rest);
  const bool fine = verdict.stability == Stability::stable;
  if (why) {
    if (left.rows() == 0)
      *why = std::string("no mode ") + cannot;
    else if (fine)
      *why = std::string("every mode that ") + cannot + " dies out by itself: " + verdict.why;
    else
      *why = std::string("a mode that ") + cannot + " is not stable: " + verdict.why;
  }
  return fine;
}

}  // namespace

std::vector<ModeTest> pbh(const System& system) {
  const System s = in_balanced_units(system).system;
  const double norm = largest_singular_value(s.A), size = norm > 0.0 ? norm : 1.0;
  const auto groups = pole_groups(s.A);
  std::vector<ModeTest> tests;
  for (const Mode& mode : modes_of(system)) {
    ModeTest test{mode.pole, true, true, 1.0, 1.0, rank_tolerance(s.order(), s.order())};
    // The group this pole is one of: tested at its mean, where the null directions are.
    const auto nearest = std::min_element(groups.begin(), groups.end(), [&](const PoleGroup& x, const PoleGroup& y) {
      return magnitude(x.pole - mode.pole) < magnitude(y.pole - mode.pole);
    });
    test.tolerance = std::max(test.tolerance, 64.0 * nearest->uncertainty / size);
    test.controllability = smallest_beside(s.A, nearest->pole, size, s.B);
    test.observability = smallest_beside(s.A.transpose(), nearest->pole, size, s.C.transpose());
    test.controllable = test.controllability > test.tolerance;
    test.observable = test.observability > test.tolerance;
    tests.push_back(test);
  }
  return tests;
}

bool stabilisable(const System& system, std::string* why) {
  const System s = in_balanced_units(system).system;
  const auto parts = controllable_staircase(s.A, s.B);
  const auto left = s.order() - parts.rank;
  const Matrix rest = (parts.T.transpose() * s.A * parts.T).bottomRightCorner(left, left);
  return harmless(rest, s.sample_period_s, "the inputs can't move", why);
}

bool detectable(const System& system, std::string* why) {
  const System s = in_balanced_units(system).system;
  const auto parts = observable_staircase(s.A, s.C);
  const auto left = s.order() - parts.rank;
  const Matrix rest = (parts.T.transpose() * s.A * parts.T).bottomRightCorner(left, left);
  return harmless(rest, s.sample_period_s, "the outputs don't show", why);
}

}  // namespace slipbench::linear
