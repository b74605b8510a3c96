// Local observability of a smooth model: the rows that its output's derivatives along the flow give.
//
//   x' = f(x), y = h(x);   row block k: d/dx (L_f^k h) / k!,   k = 0..K
//
// L_f h = dh/dx f. The solution's Taylor series y_k = L_f^k h / k! is run over dual numbers in x(0): exact, one dual level. Where x is an
// equilibrium of a linear model the blocks are C A^k / k!. (K + 1) P rows, N columns.
// Source: R. Hermann, A.J. Krener, "Nonlinear controllability and observability", IEEE Trans. Autom. Control 22(5), 1977, 728-740.
#pragma once

#include "plant/linear/system.hpp"
#include "plant/math/dual.hpp"
#include "plant/math/taylor.hpp"

namespace slipbench::linear {

// f, h: []<class Real>(const std::array<Real, N>& x) -> std::array<Real, N>, std::array<Real, P>.
template <std::size_t K, std::size_t N, class F, class H>
Matrix lie_rows(const F& f, const H& h, const std::array<double, N>& x) {
  using D = Dual<double, N>;
  std::array<D, N> start;
  for (std::size_t i = 0; i < N; ++i) start[i] = D::variable(x[i], i);
  const auto y = h(series_of_solution<K>(f, start));
  Matrix rows(static_cast<Eigen::Index>((K + 1) * y.size()), static_cast<Eigen::Index>(N));
  for (std::size_t k = 0; k <= K; ++k) {
    for (std::size_t p = 0; p < y.size(); ++p) {
      for (std::size_t i = 0; i < N; ++i)
        rows(static_cast<Eigen::Index>(k * y.size() + p), static_cast<Eigen::Index>(i)) = y[p].at[k].slope[i];
    }
  }
  return rows;
}

}  // namespace slipbench::linear
