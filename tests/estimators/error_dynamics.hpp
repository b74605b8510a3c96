// Linearised error dynamics of an observer at a steady operating point, discretised as the code itself is:
// the Jacobian of `step` in the frame that turns with the flux, by central differences, and its eigenvalues.
#pragma once

#include <Eigen/Dense>
#include <Eigen/Eigenvalues>
#include <cmath>
#include <complex>

#include "estimators/luenberger.hpp"
#include "estimators/reduced_order.hpp"
#include "tests/estimators/machines.hpp"

namespace slipbench::tests {

// A steady state of the machine with stepwise held voltage: everything turns by w_s T a period.
struct SteadyPoint {
  double w_s, w_r;                      // electrical rad/s
  Vec2<double> flux, current, voltage;  // at k = 0, voltage over [-1, 0)
};

// Flux along alpha; the held voltage's steady state is solved exactly on the machine's series (complex 2 x
// 2).
inline SteadyPoint steady_point(const BelievedMachine<double>& m, double flux, double torque, double w_r) {
  using C = std::complex<double>;
  const double i_q = torque / (m.torque_factor * flux), w_s = w_r + m.R_R * i_q / flux;
  // x(k+1) = Phi x + Gamma u, columns by linearity.
  const auto column = [&](Vec2<double> i, Vec2<double> psi, Vec2<double> u) {
    const CurrentAndFlux<double> x = ahead(m, {i, psi}, u, w_r).state;
    return Eigen::Vector2cd{C(x.current.x, x.current.y), C(x.flux.x, x.flux.y)};
  };
  const Vec2<double> o{}, e{1.0, 0.0};
  const Eigen::Vector2cd by_i = column(e, o, o), by_psi = column(o, e, o), by_u = column(o, o, e);
  const C turn = std::polar(1.0, w_s * m.period);
  // (turn - Phi)(i, psi) = Gamma u with psi given: unknown i and u.
  Eigen::Matrix2cd A;
  A.col(0) = Eigen::Vector2cd{turn, 0.0} - by_i;
  A.col(1) = -by_u;
  const Eigen::Vector2cd right = flux * (by_psi - Eigen::Vector2cd{0.0, turn}), iu = A.fullPivLu().solve(right);
  const C u_before = iu(1) / turn;  // iu(1) acts over [0, 1)
  return {w_s, w_r, {flux, 0.0}, {iu(0).real(), iu(0).imag()}, {u_before.real(), u_before.imag()}};
}

inline Vec2<double> turned(const Vec2<double>& a, double by) {
  return turn_forward(SinCos<double>{std::sin(by), std::cos(by)}, a);
}

// The state's numbers but for `started`, with vectors turned by `by`, and back.
inline Luenberger::State<double> turned(Luenberger::State<double> s, double by) {
  s.x.current = turned(s.x.current, by);
  s.x.flux = turned(s.x.flux, by);
  s.angle += by;
  return s;
}
inline ReducedOrder::State<double> turned(ReducedOrder::State<double> s, double by) {
  s.flux = turned(s.flux, by);
  s.current = turned(s.current, by);
  s.angle += by;
  return s;
}
inline void settle(Luenberger::State<double>& s, const SteadyPoint& p) {
  s.x = {p.current, p.flux};
  s.speed = p.w_r;
  s.frequency = s.frequency_between = p.w_s;
  s.started = 1.0;
}
inline void settle(ReducedOrder::State<double>& s, const SteadyPoint& p) {
  s.flux = p.flux;
  s.current = p.current;
  s.speed = s.speed_between = p.w_r;
  s.frequency = s.frequency_between = p.w_s;
  s.started = 1.0;
}

struct ErrorDynamics {
  Eigen::VectorXcd poles;  // z plane
  double slowest;          // largest ln|z| / T, 1/s: negative is stable
  double miss;             // of the fixed point, after Newton's steps
  double speed_error;      // of the fixed point, electrical rad/s
};

// Sample that the machine gives at tick 1, when the state of tick 0 stands at the point.
template <class Method>
ErrorDynamics error_dynamics(const typename Method::template Constants<double>& c, const SteadyPoint& p) {
  using State = typename Method::template State<double>;
  const double T = c.machine.period, by = p.w_s * T;
  const Vec2<double> i = turned(p.current, by), u = turned(p.voltage, by);
  Sample<double> sample;
  sample.u_alpha = u.x;
  sample.u_beta = u.y;
  sample.i_alpha = i.x;
  sample.i_beta = i.y;
  State base{};
  settle(base, p);
  const std::size_t n = numbers_of<double>(base).size() - 1;  // all but `started`, which comes last
  const auto map = [&](const Eigen::VectorXd& v) {
    State s = base;
    const auto to = numbers_of<double>(s);
    for (std::size_t k = 0; k < n; ++k) *to[k] = v(static_cast<Eigen::Index>(k));
    Method::step(s, sample, c);
    s = turned(s, -by);
    Eigen::VectorXd out(n);
    const auto from = numbers_of<double>(s);
    for (std::size_t k = 0; k < n; ++k) out(static_cast<Eigen::Index>(k)) = *from[k];
    return out;
  };
  Eigen::VectorXd x(n);
  const auto start = numbers_of<double>(base);
  for (std::size_t k = 0; k < n; ++k) x(static_cast<Eigen::Index>(k)) = *start[k];
  Eigen::MatrixXd J(n, n);
  for (int pass = 0; pass < 4; ++pass) {
    for (Eigen::Index k = 0; k < static_cast<Eigen::Index>(n); ++k) {
      const double h = 1e-6 * std::max(1.0, std::fabs(x(k)));
      Eigen::VectorXd up = x, down = x;
      up(k) += h;
      down(k) -= h;
      J.col(k) = (map(up) - map(down)) / (2.0 * h);
    }
    if (pass < 3) x += (Eigen::MatrixXd::Identity(n, n) - J).fullPivLu().solve(map(x) - x);
  }
  ErrorDynamics out;
  out.poles = J.eigenvalues();
  out.slowest = -1e300;
  for (const auto& z : out.poles) out.slowest = std::max(out.slowest, std::log(std::max(std::abs(z), 1e-300)) / T);
  out.miss = (map(x) - x).norm();
  State end = base;
  const auto to = numbers_of<double>(end);
  for (std::size_t k = 0; k < n; ++k) *to[k] = x(static_cast<Eigen::Index>(k));
  out.speed_error = end.speed - p.w_r;
  return out;
}

}  // namespace slipbench::tests
