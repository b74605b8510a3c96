// Prints random systems and what the design functions make of them, as JSON for other libraries to recompute.
//
//   design_samples SEED COUNT
//
// Case i: order 2 + i mod 11, 1 to 3 inputs and outputs, every other one discrete. Matrices are lists of rows, complex numbers [re, im].
#include <cstdint>
#include <cstdlib>
#include <iostream>
#include <nlohmann/json.hpp>

#include "plant/linear/dense.hpp"
#include "plant/linear/frequency_response.hpp"
#include "plant/linear/kalman.hpp"
#include "plant/linear/place.hpp"
#include "plant/linear/reference_gain.hpp"
#include "plant/linear/response.hpp"

using namespace slipbench::linear;
using nlohmann::json;

namespace {

using Index = Eigen::Index;

// splitmix64 (G. Steele, D. Lea, C. Flood, OOPSLA 2014).
struct Draws {
  std::uint64_t state;
  double operator()() {  // (-1, 1)
    std::uint64_t z = (state += 0x9e3779b97f4a7c15u);
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return static_cast<double>((z ^ (z >> 31)) >> 11) * 0x1p-52 - 1.0;
  }
  Matrix matrix(Index rows, Index columns) {
    Matrix m(rows, columns);
    for (Index i = 0; i < rows; ++i)
      for (Index j = 0; j < columns; ++j) m(i, j) = (*this)();
    return m;
  }
};

json list(const Matrix& m) {
  json all = json::array();
  for (Index i = 0; i < m.rows(); ++i) {
    json row = json::array();
    for (Index j = 0; j < m.cols(); ++j) row.push_back(m(i, j));
    all.push_back(row);
  }
  return all;
}

json list(const std::vector<Complex>& values) {
  json all = json::array();
  for (const auto v : values) all.push_back({v.real(), v.imag()});
  return all;
}

std::vector<Complex> wish(Draws& draw, Index n, bool discrete) {
  std::vector<Complex> poles;
  while (static_cast<Index>(poles.size()) + 2 <= n) {
    const double a = draw(), b = draw(), c = draw();
    if (c > 0.0) {
      const Complex p = discrete ? Complex(.3 * a, .2 + .3 * std::abs(b)) : Complex(-1.5 + a, .3 + std::abs(b));
      poles.insert(poles.end(), {p, std::conj(p)});
    } else {
      for (const double x : {a, b}) poles.emplace_back(discrete ? .7 * x : -1.5 + x);
    }
  }
  if (static_cast<Index>(poles.size()) < n) poles.emplace_back(discrete ? .7 * draw() : -1.5 + draw());
  return poles;
}

json one_case(Draws& draw, Index i) {
  const Index n = 2 + i % 11, m = 1 + (i / 2) % 3, p = 1 + (i / 6) % 3;
  const bool discrete = i % 2 == 1;
  System s;
  s.A = draw.matrix(n, n) * (discrete ? 1.8 / std::sqrt(static_cast<double>(n)) : 1.0);
  s.B = draw.matrix(n, m);
  s.C = draw.matrix(p, n);
  s.D = draw.matrix(p, m);
  s.sample_period_s = discrete ? .1 : 0.0;
  const Matrix root = draw.matrix(n + m, n + m), all = root.transpose() * root + .1 * Matrix::Identity(n + m, n + m);
  const Matrix noise = draw.matrix(n, n), seen = draw.matrix(p, p);
  const Matrix W = noise * noise.transpose(), V = seen * seen.transpose() + .1 * Matrix::Identity(p, p);
  const Matrix Q = all.topLeftCorner(n, n), R = all.bottomRightCorner(m, m), N = all.topRightCorner(n, m);
  const auto f = lqr(s, Q, R, N);
  const auto k = stationary_kalman(s, W, V);
  const auto poles = wish(draw, n, discrete);
  const auto placed = place(s, poles);
  const auto step = step_response(s, 0, .1, 10);
  const double w = 1.0 + std::abs(draw());
  const auto at = frequency_response(s, w);
  json j = {{"order", n},    {"discrete", discrete ? 1 : 0}, {"A", list(s.A)}, {"B", list(s.B)}, {"C", list(s.C)},
            {"D", list(s.D)}};
  j.update({{"Q", list(Q)}, {"R", list(R)}, {"N", list(N)}, {"W", list(W)}, {"V", list(V)}});
  j.update({{"lqr", {{"K", list(f.K)}, {"P", list(f.P)}, {"poles", list(f.poles)}, {"warning", f.warning}}}});
  j.update({{"kalman", {{"L", list(k.L)}, {"P", list(k.P)}, {"poles", list(k.poles)}, {"warning", k.warning}}}});
  j.update({{"place",
             {{"wished", list(poles)},
              {"K", list(placed.K)},
              {"condition", placed.condition},
              {"error", placed.residual}}}});
  j.update({{"step", list(step.y)}, {"frequency", w}, {"re", list(at.G.real())}, {"im", list(at.G.imag())}});
  if (m == p)
    j["reference_gain"] = list(reference_gain(s, f.K).N);
  else
    j["reference_gain"] = json::array();
  return j;
}

}  // namespace

int main(int count, char** words) {
  if (count != 3) return 2;
  Draws draw{std::strtoull(words[1], nullptr, 10)};
  json cases = json::array();
  for (Index i = 0; i < std::atoi(words[2]); ++i) cases.push_back(one_case(draw, i));
  std::cout << cases.dump() << '\n';
}
