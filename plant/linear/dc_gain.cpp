#include <limits>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/minimal.hpp"
#include "plant/linear/zeros.hpp"

namespace slipbench::linear {

Matrix dc_gain(const System& given) {
  const auto n = given.order();
  if (n == 0 || given.D.size() == 0) return given.D;
  const BalancedUnits balanced = in_balanced_units(given);
  const System& s = balanced.system;
  const double at = given.discrete() ? 1.0 : 0.0;
  Matrix shifted = -s.A;
  shifted.diagonal().array() += at;
  const Svd of = svd(shifted);
  // Below this the smallest singular value is rounding alone.
  const double size = std::max(of.s(0), at) * 16.0 * static_cast<double>(n) * std::numeric_limits<double>::epsilon();
  if (of.s(n - 1) <= size) {
    const Minimal smaller = minimal(given);
    if (smaller.system.order() < n) return dc_gain(smaller.system);
    throw LinearError(std::string("pole ") + (given.discrete() ? "1" : "0") + " is an integrator in " +
                      direction_text(given, of.V.col(n - 1)) + ", and a constant input makes it run away");
  }
  const Matrix inner = s.C * of.V * of.s.cwiseInverse().asDiagonal() * of.U.transpose() * s.B;
  return given.D + balanced.output.asDiagonal() * inner * balanced.input.cwiseInverse().asDiagonal();
}

}  // namespace slipbench::linear
