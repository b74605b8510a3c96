#include "plant/linear/poles.hpp"

#include <Eigen/SVD>
#include <algorithm>
#include <cmath>
#include <limits>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"
#include "plant/math/elementary.hpp"

namespace slipbench::linear {
namespace {

constexpr double eps = std::numeric_limits<double>::epsilon(), infinity = std::numeric_limits<double>::infinity();

struct Null {
  Eigen::Index directions;
  double angle;  // |y'x| of the smallest singular pair: 1 / condition of a simple eigenvalue
};

Null null_at(const Matrix& a, Complex p, double threshold) {
  ComplexMatrix shifted = a.cast<Complex>();
  shifted.diagonal().array() -= p;
  const Eigen::JacobiSVD<ComplexMatrix> of(shifted, Eigen::ComputeFullU | Eigen::ComputeFullV);
  const auto last = a.rows() - 1;
  return {(of.singularValues().array() <= threshold).count(),
          magnitude(of.matrixU().col(last).dot(of.matrixV().col(last)))};
}

// x^(1/k) through our own logarithm and exponential.
double root(double x, Eigen::Index k) { return slipbench::exp(slipbench::log(x) / static_cast<double>(k)); }

struct Cluster {
  Complex mean;
  double radius;
};

Cluster cluster_of(const std::vector<Complex>& poles, const std::vector<std::size_t>& nearest, std::size_t count) {
  Complex mean = 0.0;
  for (std::size_t k = 0; k < count; ++k) mean += poles[nearest[k]];
  mean = Complex(mean.real() / static_cast<double>(count), mean.imag() / static_cast<double>(count));
  double radius = 0.0;
  for (std::size_t k = 0; k < count; ++k) radius = std::max(radius, magnitude(poles[nearest[k]] - mean));
  return {mean, radius};
}

}  // namespace

Mode mode_of(Complex pole, double period_s) {
  Mode mode{pole, 0.0, 0.0, infinity};
  const bool discrete = period_s > 0.0;
  if (discrete && pole == Complex(0.0)) return {pole, 1.0, infinity, 0.0};
  const Complex s = discrete ? logarithm_of(pole) / period_s : pole;
  mode.frequency_rad_s = magnitude(s);
  if (mode.frequency_rad_s > 0.0) mode.damping = -s.real() / mode.frequency_rad_s;
  if (s.real() != 0.0) mode.time_constant_s = -1.0 / s.real();
  return mode;
}

std::vector<Mode> modes_of(const System& system) {
  std::vector<Complex> poles = eigenvalues(system.A);
  if (system.discrete())
    std::stable_sort(poles.begin(), poles.end(), [](Complex x, Complex y) { return magnitude(x) > magnitude(y); });
  std::vector<Mode> modes;
  for (const Complex& pole : poles) modes.push_back(mode_of(pole, system.sample_period_s));
  return modes;
}

std::vector<PoleGroup> pole_groups(const Matrix& given) {
  std::vector<PoleGroup> groups;
  const auto n = given.rows();
  if (n == 0) return groups;
  const std::vector<Complex> poles = eigenvalues(given);
  const Vector scale = balancing_scale(given);
  const Matrix a = scale.cwiseInverse().asDiagonal() * given * scale.asDiagonal();
  const double norm = a.norm(), rounding = static_cast<double>(n) * eps;
  // First-order bound of what rounding does to each: a defective pole's is out of bounds.
  std::vector<double> moved;
  for (const Complex& p : poles) moved.push_back(rounding * norm / std::max(null_at(a, p, 0.0).angle, eps));
  std::vector<bool> taken(poles.size(), false);
  for (std::size_t i = 0; i < poles.size(); ++i) {
    if (taken[i]) continue;
    std::vector<std::size_t> nearest;
    for (std::size_t j = 0; j < poles.size(); ++j)
      if (!taken[j]) nearest.push_back(j);
    std::stable_sort(nearest.begin(), nearest.end(), [&](std::size_t x, std::size_t y) {
      return magnitude(poles[x] - poles[i]) < magnitude(poles[y] - poles[i]);
    });
    // A pole worse known than the root of rounding is a repeated one.
    PoleGroup group{poles[i], 1, 1, 0.0, std::min(moved[i], root(rounding, 2) * norm)};
    for (std::size_t count = nearest.size(); count > 1; --count) {
      const Cluster cluster = cluster_of(poles, nearest, count);
      const auto k = static_cast<Eigen::Index>(count);
      double reach = 4.0 * norm * root(rounding, k);
      for (std::size_t j = 0; j < count; ++j) reach = std::min(reach, 8.0 * moved[nearest[j]]);
      const double coincide = 256.0 * rounding * norm;
      if (cluster.radius > std::max(reach, coincide)) continue;
      const double threshold = std::max(64.0 * rounding * norm, 2.0 * cluster.radius);
      const auto directions = std::min(null_at(a, cluster.mean, threshold).directions, k);
      // As many directions as poles: each is known by itself, and only those that coincide are one.
      if (directions == k && cluster.radius > coincide) continue;
      Complex mean = cluster.mean;
      if (std::fabs(mean.imag()) <= rounding * norm) mean.imag(0.0);
      group = {mean, k, std::max<Eigen::Index>(directions, 1), cluster.radius,
               std::max(cluster.radius / 64.0, rounding * norm)};
      if (directions < k) group.uncertainty = std::max(rounding, trusted_digits / 64.0) * norm;
      break;
    }
    for (Eigen::Index k = 0; k < group.count; ++k) taken[nearest[static_cast<std::size_t>(k)]] = true;
    groups.push_back(group);
  }
  return groups;
}

}  // namespace slipbench::linear
