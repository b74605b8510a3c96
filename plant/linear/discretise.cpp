#include "plant/linear/discretise.hpp"

#include <Eigen/LU>
#include <algorithm>
#include <cmath>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/exponential.hpp"
#include "plant/linear/poles.hpp"
#include "plant/linear/transfer.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

constexpr double pi = 3.141592653589793;

void hold(const System& s, double period_s, System* out) {
  const auto n = s.order(), m = s.inputs();
  // A large input unit must not make the exponential scale and square further than A asks for.
  const Vector unit = in_balanced_units(s).input;
  Matrix both = Matrix::Zero(n + m, n + m);
  both.topLeftCorner(n, n) = s.A * period_s;
  both.topRightCorner(n, m) = s.B * unit.asDiagonal() * period_s;
  const Matrix e = exponential(both);
  out->A = e.topLeftCorner(n, n);
  out->B = e.topRightCorner(n, m) * unit.cwiseInverse().asDiagonal();
}

void trapezium(const System& s, double period_s, System* out) {
  const auto n = s.order();
  if (n == 0) return;
  const double h = 0.5 * period_s;
  for (const Complex& pole : eigenvalues(s.A))
    if (magnitude(h * pole - 1.0) < rank_tolerance(n, n))
      throw LinearError("Tustin's rule can't map the pole " + text_of(pole) + " at 2 / period: choose another period");
  const Vector scale = balancing_scale(s.A), inverse = scale.cwiseInverse();
  const Matrix a = inverse.asDiagonal() * s.A * scale.asDiagonal() * h, one = Matrix::Identity(n, n);
  const Matrix w = scale.asDiagonal() * (one - a).partialPivLu().inverse() * inverse.asDiagonal();
  out->A = scale.asDiagonal() * (one - a).partialPivLu().solve(one + a) * inverse.asDiagonal();
  out->B = w * s.B * period_s;
  out->C = s.C * w;
  out->D = s.D + out->C * s.B * h;
}

double response_error(const System& given, const System& sampled, double period_s, double up_to) {
  const double top = up_to * pi / period_s, step = slipbench::exp(-slipbench::log(10.0) / 40.0);
  double worst = 0.0, w = top;
  for (int k = 0; k <= 120; ++k, w *= step) {
    try {
      const ComplexMatrix exact = transfer_at(given, Complex(0.0, w));
      const double size = exact.norm(), off = (transfer_at(sampled, unit_at(w * period_s)) - exact).norm();
      if (size > 0.0) worst = std::max(worst, off / size);
    } catch (const LinearError&) {
      continue;  // a pole on the axis, met exactly: no response there to compare
    }
  }
  return worst;
}

double pole_error(const System& given, const System& sampled, double period_s) {
  std::vector<Complex> wanted, found = eigenvalues(sampled.A);
  for (const Complex& pole : eigenvalues(given.A)) wanted.push_back(exponential_of(period_s * pole));
  double worst = 0.0;
  while (!wanted.empty()) {
    std::size_t at = 0, with = 0;
    double least = magnitude(wanted[0] - found[0]);
    for (std::size_t i = 0; i < wanted.size(); ++i)
      for (std::size_t j = 0; j < found.size(); ++j)
        if (const double off = magnitude(wanted[i] - found[j]); off < least) {
          least = off;
          at = i;
          with = j;
        }
    worst = std::max(worst, least);
    wanted.erase(wanted.begin() + static_cast<std::ptrdiff_t>(at));
    found.erase(found.begin() + static_cast<std::ptrdiff_t>(with));
  }
  return worst;
}

}  // namespace

const char* name_of(Discretisation method) {
  switch (method) {
    case Discretisation::zero_order_hold:
      return "zero_order_hold";
    case Discretisation::euler:
      return "euler";
    default:
      return "tustin";
  }
}

System discretise(const System& system, double period_s, Discretisation method) {
  if (system.discrete()) throw LinearError("the system is discrete already");
  if (!(period_s > 0.0) || !std::isfinite(period_s)) throw LinearError("the period must be a finite time above 0 s");
  System out = system;
  out.sample_period_s = period_s;
  switch (method) {
    case Discretisation::zero_order_hold:
      hold(system, period_s, &out);
      break;
    case Discretisation::euler:
      out.A = Matrix::Identity(system.order(), system.order()) + system.A * period_s;
      out.B = system.B * period_s;
      break;
    case Discretisation::tustin:
      trapezium(system, period_s, &out);
      break;
  }
  return out;
}

DiscretisationError discretisation_error(const System& system, double period_s, Discretisation method) {
  const System sampled = discretise(system, period_s, method);
  DiscretisationError error;
  error.response_to_tenth = response_error(system, sampled, period_s, 0.1);
  error.response_to_half = response_error(system, sampled, period_s, 0.5);
  error.pole = pole_error(system, sampled, period_s);
  if (stability_of(system).stability == Stability::stable)
    if (const Verdict verdict = stability_of(sampled); verdict.stability != Stability::stable)
      error.warning = "a stable system, but not after this discretisation: " + verdict.why;
  return error;
}

}  // namespace slipbench::linear
