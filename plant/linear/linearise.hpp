// A smooth model as a linear system about a point, by dual numbers: exact Jacobians, no step width.
//
//   x' = f(x, u), y = h(x, u)   ->   A = df/dx, B = df/du, C = dh/dx, D = dh/du   at (x_0, u_0)
//
// f and h are written over any number type:
//   []<class Real>(const std::array<Real, N>& x, const std::array<Real, M>& u) -> std::array<Real, N> (f), std::array<Real, P> (h)
// The system's x, u and y are deviations from the point; where f is a map to the next sample, set sample_period_s of what comes back.
#pragma once

#include <array>

#include "plant/linear/system.hpp"
#include "plant/math/dual.hpp"

namespace slipbench::linear {

template <std::size_t N, std::size_t M, class F, class H>
System linearise(const F& f, const H& h, const std::array<double, N>& x0, const std::array<double, M>& u0) {
  using D = Dual<double, N + M>;
  std::array<D, N> x;
  std::array<D, M> u;
  for (std::size_t i = 0; i < N; ++i) x[i] = D::variable(x0[i], i);
  for (std::size_t i = 0; i < M; ++i) u[i] = D::variable(u0[i], N + i);
  const auto block = [](const auto& rows, std::size_t first, std::size_t count) {
    Matrix m(static_cast<Eigen::Index>(rows.size()), static_cast<Eigen::Index>(count));
    for (std::size_t r = 0; r < rows.size(); ++r) {
      for (std::size_t c = 0; c < count; ++c)
        m(static_cast<Eigen::Index>(r), static_cast<Eigen::Index>(c)) = rows[r].slope[first + c];
    }
    return m;
  };
  const auto rate = f(x, u), output = h(x, u);
  System s;
  s.A = block(rate, 0, N);
  s.B = block(rate, N, M);
  s.C = block(output, 0, N);
  s.D = block(output, N, M);
  return s;
}

}  // namespace slipbench::linear
