#include "plant/linear/frequency_response.hpp"

#include <Eigen/Dense>
#include <utility>

#include "plant/linear/dense.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

using Index = Eigen::Index;

struct Reduced {
  Matrix H, B, C, D;
  double period;
};

Reduced reduced(const System& s) {
  if (s.order() < 2) return {s.A, s.B, s.C, s.D, s.sample_period_s};
  const Eigen::HessenbergDecomposition<Matrix> h(s.A);
  const Matrix T = h.matrixQ();
  return {h.matrixH(), T.transpose() * s.B, s.C * T, s.D, s.sample_period_s};
}

// (z I - H) X = B for upper Hessenberg H, rows exchanged where the subdiagonal is larger. A pivot that is all rounding: a pole.
ComplexMatrix solved(const Matrix& H, Complex z, const Matrix& B, double frequency_rad_s) {
  const auto n = H.rows();
  ComplexMatrix M = z * ComplexMatrix::Identity(n, n) - H, X = B.cast<Complex>();
  const double doubt = 8.0 * 0x1p-52 * static_cast<double>(n) * M.norm();
  for (Index k = 0; k < n; ++k) {
    if (k + 1 < n && std::norm(M(k + 1, k)) > std::norm(M(k, k))) {
      M.row(k).swap(M.row(k + 1));
      X.row(k).swap(X.row(k + 1));
    }
    if (!(magnitude(M(k, k)) > doubt))
      throw LinearError("there is no gain at " + std::to_string(frequency_rad_s) + " rad/s: the system has a pole at " +
                        text_of(z));
    if (k + 1 == n) break;
    const Complex f = M(k + 1, k) / M(k, k);
    M.row(k + 1).tail(n - k) -= f * M.row(k).tail(n - k);
    X.row(k + 1) -= f * X.row(k);
  }
  for (Index k = n - 1; k >= 0; --k) {
    for (Index j = k + 1; j < n; ++j) X.row(k) -= M(k, j) * X.row(j);
    X.row(k) /= M(k, k);
  }
  return X;
}

FrequencyPoint point(const Reduced& s, double w) {
  if (!(w >= 0.0) || !(w < 1e300)) throw LinearError("a frequency must be 0 rad/s or above");
  const Complex z = s.period > 0.0 ? unit_at(w * s.period) : Complex(0.0, w);
  FrequencyPoint p;
  p.frequency_rad_s = w;
  p.G = s.C * solved(s.H, z, s.B, w) + s.D;
  p.gain.resize(p.G.rows(), p.G.cols());
  p.phase_rad.resize(p.G.rows(), p.G.cols());
  for (Index i = 0; i < p.G.size(); ++i) {
    p.gain(i) = magnitude(p.G(i));
    p.phase_rad(i) = slipbench::atan2(p.G(i).imag(), p.G(i).real());
  }
  return p;
}

}  // namespace

FrequencyPoint frequency_response(const System& system, double frequency_rad_s) {
  return point(reduced(checked(system)), frequency_rad_s);
}

std::vector<FrequencyPoint> frequency_response(const System& system, const std::vector<double>& frequencies_rad_s) {
  const auto s = reduced(checked(system));
  std::vector<FrequencyPoint> points;
  constexpr double turn = 0x1.921fb54442d18p+2;
  for (const double w : frequencies_rad_s) {
    points.push_back(point(s, w));
    if (points.size() < 2) continue;
    auto& now = points.back().phase_rad;
    const auto& before = points[points.size() - 2].phase_rad;
    for (Index i = 0; i < now.size(); ++i) now(i) -= turn * slipbench::floor((now(i) - before(i)) / turn + 0.5);
  }
  return points;
}

std::vector<double> logarithmic(double first, double last, std::size_t count) {
  if (!(first > 0.0) || !(last > first) || count < 2)
    throw LinearError("a logarithmic scale needs 0 < first < last and two frequencies or more");
  std::vector<double> w(count);
  const double low = slipbench::log(first), span = slipbench::log(last) - low;
  for (std::size_t i = 0; i < count; ++i)
    w[i] = slipbench::exp(low + span * static_cast<double>(i) / static_cast<double>(count - 1));
  w.front() = first;
  w.back() = last;
  return w;
}

}  // namespace slipbench::linear
