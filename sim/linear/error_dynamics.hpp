// Poles of an estimator's error at a steady state, as its code is discretised: the Jacobian of `step` over all numbers of its state, by
// dual numbers, in the frame that turns with the flux.
//
//   s_{k+1} = e^{-j w_s T} step(s_k, sample_{k+1})      sample of the plant's exact turning point; a fixed point s*, found by Newton
//   J = d s_{k+1} / d s_k at s*                          poles z of J; slowest = max ln|z| / T, 1/s
//
// The plant does not hear the estimator, so plant and estimator together have the plant's own poles and these. Numbers that reach no
// estimate (a monitor, a load that no equation uses) are left out; mirrored entries of a covariance and the like give poles at z = 0.
// A Kalman filter's covariance is part of the state and stands at its stationary value, its own poles among these.
#pragma once

#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <limits>
#include <vector>

#include "estimators/sample.hpp"
#include "plant/linear/system.hpp"
#include "plant/math/dual.hpp"
#include "sim/linear/turning_state.hpp"

namespace slipbench {

struct ErrorDynamics {
  std::vector<linear::Complex> poles;  // z plane
  double slowest_per_s = 0.0;          // negative is stable
  double miss = 0.0;                   // of the fixed point, each number against 1 or itself
  double speed_error_rad_s = 0.0;      // of the estimate at the fixed point, mechanical: not 0 where belief is wrong
  [[nodiscard]] bool settled() const { return miss < 1e-9; }
  [[nodiscard]] bool stable() const { return settled() && slowest_per_s < 0.0; }
};

template <class State>
constexpr std::size_t count_numbers() {
  State state{};
  std::size_t count = 0;
  each_number(state, [&](auto&) { ++count; });
  return count;
}

template <class Method>
class ErrorMap {
 public:
  using State = typename Method::template State<double>;
  using Constants = typename Method::template Constants<double>;
  static constexpr std::size_t N = count_numbers<State>();
  using D = Dual<double, N>;
  using Numbers = std::array<double, N>;

  ErrorMap(const Constants& c, const TurningPoint& p)
      : c_(c), dual_c_(dual_of<typename Method::template Constants<D>>(c)), p_(p) {
    const SinCos<double> by = sincos(p.w_s * p.period_s);
    const Vec2<double> i = turn_forward(by, p.current), u = turn_forward(by, p.voltage);
    sample_.u_alpha = u.x;
    sample_.u_beta = u.y;
    sample_.i_alpha = i.x;
    sample_.i_beta = i.y;
    sample_.dc_link = sample_.speed = std::numeric_limits<double>::quiet_NaN();
    // Those that find the speed themselves are told none: one that listened would be found out.
    if constexpr (requires { Method::needs_speed; }) sample_.speed = p.w_r / p.pole_pairs;
    sample_.tick = 1;
  }

  // One period on, seen from the turning frame again.
  [[nodiscard]] State next(State s) const {
    Method::step(s, sample_, c_);
    return turned_state<double>(s, -p_.w_s * p_.period_s);
  }

  struct Linear {
    Numbers next;
    linear::Matrix J;
    std::array<bool, N> seen{};  // numbers that reach an estimate in this step
    double speed = 0.0;
  };
  [[nodiscard]] Linear linearised(const State& at) const {
    auto s = dual_of<typename Method::template State<D>>(at);
    std::size_t index = 0;
    each_number(s, [&](D& x) { x = D::variable(x.value, index++); });
    const Estimate<D> e = Method::step(s, dual_of<Sample<D>>(sample_), dual_c_);
    s = turned_state<D>(s, -p_.w_s * p_.period_s);
    Linear out;
    out.J.resize(N, N);
    Eigen::Index r = 0;
    each_number(s, [&](const D& x) {
      out.next[static_cast<std::size_t>(r)] = x.value;
      for (std::size_t c = 0; c < N; ++c) out.J(r, static_cast<Eigen::Index>(c)) = x.slope[c];
      ++r;
    });
    for (std::size_t c = 0; c < N; ++c)
      out.seen[c] = e.speed.slope[c] != 0.0 || e.rotor_flux.slope[c] != 0.0 || e.rotor_flux_angle.slope[c] != 0.0 ||
                    e.torque.slope[c] != 0.0;
    out.speed = e.speed.value;
    return out;
  }

 private:
  template <class To, class From>
  static To dual_of(const From& from) {
    return in_number<To, D>(from);
  }

  Constants c_;
  typename Method::template Constants<D> dual_c_;
  TurningPoint p_;
  Sample<double> sample_;
};

namespace detail {

// Rows and columns of J that lead to an estimate, over as many steps as it takes.
template <std::size_t N>
linear::Matrix reaching(const linear::Matrix& J, std::array<bool, N> seen) {
  for (bool more = true; more;) {
    more = false;
    for (std::size_t r = 0; r < N; ++r) {
      for (std::size_t c = 0; seen[r] && c < N; ++c) {
        if (seen[c] || J(static_cast<Eigen::Index>(r), static_cast<Eigen::Index>(c)) == 0.0) continue;
        seen[c] = more = true;
      }
    }
  }
  std::vector<Eigen::Index> kept;
  for (std::size_t n = 0; n < N; ++n) {
    if (seen[n]) kept.push_back(static_cast<Eigen::Index>(n));
  }
  return J(kept, kept);
}

}  // namespace detail

// The state that the truth is told to for so many ticks, so that the rest (a covariance, filters) settles about the truth also where the
// estimator by itself would run away.
template <class Method>
typename Method::template State<double> held_at_truth(const typename Method::template Constants<double>& c,
                                                      typename Method::template State<double> state,
                                                      const TurningPoint& p, int ticks) {
  const ErrorMap<Method> map(c, p);
  for (int k = 0; k < ticks; ++k) {
    tell_truth("", state, p);
    state = map.next(state);
  }
  tell_truth("", state, p);
  return state;
}

template <class Method>
struct FixedPoint {
  typename ErrorMap<Method>::Linear linear;
  double miss = 0.0;
};
// Newton's steps from `state`, which becomes the fixed point.
template <class Method>
FixedPoint<Method> find_fixed_point(const typename Method::template Constants<double>& c,
                                    typename Method::template State<double>& state, const TurningPoint& p) {
  using Map = ErrorMap<Method>;
  constexpr int most_rounds = 40;
  const Map map(c, p);
  const auto x = numbers_of<double>(state);
  FixedPoint<Method> found;
  double before = std::numeric_limits<double>::infinity();
  for (int round = 0; round < most_rounds; ++round) {
    found.linear = map.linearised(state);
    const typename Map::Linear& now = found.linear;
    linear::Vector away(static_cast<Eigen::Index>(Map::N));
    found.miss = 0.0;
    for (std::size_t n = 0; n < Map::N; ++n) {
      away(static_cast<Eigen::Index>(n)) = now.next[n] - *x[n];
      found.miss = max(found.miss, fabs(now.next[n] - *x[n]) / max(1.0, fabs(*x[n])));
    }
    if (!(found.miss < 1e12) || !now.J.allFinite()) break;         // no fixed point that Newton's steps could find
    if (found.miss < 1e-9 && !(found.miss < 0.5 * before)) break;  // as near as rounding lets it
    before = found.miss;
    const linear::Vector step = (linear::Matrix::Identity(now.J.rows(), now.J.cols()) - now.J).fullPivLu().solve(away);
    for (std::size_t n = 0; n < Map::N; ++n) *x[n] += step(static_cast<Eigen::Index>(n));
  }
  return found;
}

template <class Method>
ErrorDynamics dynamics_at(const FixedPoint<Method>& found, const TurningPoint& p) {
  constexpr double infinity = std::numeric_limits<double>::infinity();
  ErrorDynamics out;
  out.miss = found.miss;
  out.speed_error_rad_s = found.linear.speed - p.w_r / p.pole_pairs;
  const linear::Matrix J =
      found.linear.J.allFinite() ? detail::reaching(found.linear.J, found.linear.seen) : linear::Matrix();
  if (J.size() == 0) {  // not a number, or held by a limit: nothing moves the estimate
    out.slowest_per_s = out.miss = infinity;
    return out;
  }
  const Eigen::VectorXcd z = J.eigenvalues();
  out.poles.assign(z.data(), z.data() + z.size());
  out.slowest_per_s = -infinity;
  for (const auto& pole : out.poles) {
    const double size = sqrt(square(pole.real()) + square(pole.imag()));
    out.slowest_per_s = max(out.slowest_per_s, log(max(size, 1e-300)) / p.period_s);
  }
  return out;
}

// All of it; `start` is the method's state as it begins.
template <class Method>
ErrorDynamics error_dynamics(const typename Method::template Constants<double>& c,
                             const typename Method::template State<double>& start, const TurningPoint& p,
                             int held_ticks = 400) {
  auto state = held_at_truth<Method>(c, start, p, held_ticks);
  return dynamics_at<Method>(find_fixed_point<Method>(c, state, p), p);
}

}  // namespace slipbench
