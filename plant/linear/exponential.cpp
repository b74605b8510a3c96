#include "plant/linear/exponential.hpp"

#include <Eigen/LU>
#include <array>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"

namespace slipbench::linear {
namespace {

// Numerator coefficients b_0 .. b_m of the [m/m] Pade approximant, Higham 2005, table 2.3 with its algorithm 2.3.
constexpr std::array<double, 4> pade3 = {120, 60, 12, 1};
constexpr std::array<double, 6> pade5 = {30240, 15120, 3360, 420, 30, 1};
constexpr std::array<double, 8> pade7 = {17297280, 8648640, 1995840, 277200, 25200, 1512, 56, 1};
constexpr std::array<double, 10> pade9 = {17643225600, 8821612800, 2075673600, 302702400, 30270240,
                                          2162160,     110880,     3960,       90,        1};
constexpr std::array<double, 14> pade13 = {64764752532480000,
                                           32382376266240000,
                                           7771770303897600,
                                           1187353796428800,
                                           129060195264000,
                                           10559470521600,
                                           670442572800,
                                           33522128640,
                                           1323241920,
                                           40840800,
                                           960960,
                                           16380,
                                           182,
                                           1};
// ||A||_1 up to which each keeps its backward error below 2^-53.
constexpr double theta3 = 1.495585217958292e-2, theta5 = 2.539398330063230e-1, theta7 = 9.504178996162932e-1,
                 theta9 = 2.097847961257068, theta13 = 5.371920351148152;

// odd and even part: r = (V - U)^-1 (V + U)
Matrix quotient(const Matrix& u, const Matrix& v) { return (v - u).partialPivLu().solve(v + u); }

template <std::size_t count>
Matrix approximant(const Matrix& a, const std::array<double, count>& b) {
  const Matrix identity = Matrix::Identity(a.rows(), a.cols()), a2 = a * a;
  Matrix power = identity, u = b[1] * identity, v = b[0] * identity;
  for (std::size_t k = 2; k + 1 < count; k += 2) {
    power = power * a2;
    v += b[k] * power;
    u += b[k + 1] * power;
  }
  return quotient(a * u, v);
}

Matrix approximant13(const Matrix& a) {
  const auto& b = pade13;
  const Matrix identity = Matrix::Identity(a.rows(), a.cols()), a2 = a * a, a4 = a2 * a2, a6 = a4 * a2;
  const Matrix u =
      a * (a6 * (b[13] * a6 + b[11] * a4 + b[9] * a2) + b[7] * a6 + b[5] * a4 + b[3] * a2 + b[1] * identity);
  const Matrix v = a6 * (b[12] * a6 + b[10] * a4 + b[8] * a2) + b[6] * a6 + b[4] * a4 + b[2] * a2 + b[0] * identity;
  return quotient(u, v);
}

Matrix unscaled(const Matrix& a) {
  const double size = one_norm(a);
  if (size <= theta3) return approximant(a, pade3);
  if (size <= theta5) return approximant(a, pade5);
  if (size <= theta7) return approximant(a, pade7);
  if (size <= theta9) return approximant(a, pade9);
  int squarings = 0;
  double factor = 1.0;
  for (; size * factor > theta13; ++squarings) factor *= 0.5;
  Matrix e = approximant13(factor * a);
  for (; squarings > 0; --squarings) e = e * e;
  return e;
}

}  // namespace

Matrix exponential(const Matrix& a) {
  if (a.size() == 0) return a;
  if (!a.allFinite()) throw LinearError("the matrix exponential needs finite numbers");
  const Vector scale = balancing_scale(a), inverse = scale.cwiseInverse();
  const Matrix e = scale.asDiagonal() * unscaled(inverse.asDiagonal() * a * scale.asDiagonal()) * inverse.asDiagonal();
  if (!e.allFinite())
    throw LinearError("the matrix exponential does not fit a double: its largest pole is " +
                      text_of(eigenvalues(a).front()) + ", times the period if there is one");
  return e;
}

}  // namespace slipbench::linear
