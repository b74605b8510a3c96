#include "plant/linear/transfer.hpp"

#include <Eigen/LU>
#include <algorithm>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"

namespace slipbench::linear {

ComplexMatrix transfer_at(const System& system, Complex s) {
  ComplexMatrix g = system.D.cast<Complex>();
  const auto n = system.order();
  if (n == 0 || g.size() == 0) return g;
  const Vector scale = balancing_scale(system.A), inverse = scale.cwiseInverse();
  ComplexMatrix pencil = -(inverse.asDiagonal() * system.A * scale.asDiagonal()).cast<Complex>();
  pencil.diagonal().array() += s;
  const ComplexMatrix b = (inverse.asDiagonal() * system.B).cast<Complex>();
  const Eigen::FullPivLU<ComplexMatrix> lu(pencil);
  if (!lu.isInvertible())
    throw LinearError("the transfer function has no value at " + text_of(s) + ": the system has a pole there");
  return g + (system.C * scale.asDiagonal()).cast<Complex>() * lu.solve(b);
}

double transfer_difference(const System& a, const System& b) {
  if (a.D.size() == 0) return 0.0;
  double radius = 0.0;
  for (const System* s : {&a, &b})
    for (const Complex& pole : eigenvalues(s->A)) radius = std::max(radius, magnitude(pole));
  if (radius == 0.0) radius = 1.0;
  double size = 0.0, off = 0.0;
  bool compared = false;
  for (const double at : {1.3, 0.7, 0.2, 4.0})
    for (const double angle : {0.4, 1.3, 2.2, 2.9}) {
      const Complex s = radius * at * unit_at(angle);
      try {
        const ComplexMatrix of_a = transfer_at(a, s), of_b = transfer_at(b, s);
        size = std::max(size, of_a.norm());
        off = std::max(off, (of_a - of_b).norm());
        compared = true;
      } catch (const LinearError&) {  // so ill-conditioned that this point, too, passes for a pole
      }
    }
  if (!compared) return 1.0;
  return size > 0.0 ? off / size : off > 0.0 ? 1.0 : 0.0;
}

std::vector<Matrix> markov_parameters(const System& system, int count) {
  std::vector<Matrix> h;
  Matrix reached = system.B;
  for (int k = 0; k < count; ++k) {
    h.push_back(system.C * reached);
    reached = system.A * reached;
  }
  return h;
}

}  // namespace slipbench::linear
