// Which drawn key decides a figure: Sobol indices of an output y over keys x_1 .. x_d that are drawn independently.
//
//   first order  S_j = Var(E(y | x_j)) / Var(y): the share of the variance that goes if x_j alone is known
//   total        T_j = E(Var(y | all but x_j)) / Var(y): the share that stays if all but x_j are known; T_j >= S_j
//
// Saltelli plan, N base points with outputs a of A, b of B, c_j of A with key j from B:
//   S_j = mean((b - m) (c_j - a)) / V    T_j = mean((a - c_j)^2) / (2 V)
//   m, V: mean and variance of all N (d + 2) outputs, not of A and B alone: a rare large one then weighs above and below the line
// Plain draws, N points, each key cut into M = min(64, 2 N^(1/3)) stretches of equal probability, M' of which were met:
//   S_j = 1 - (SS_within / (N - M')) / (SS_all / (N - 1)): Kelley's correlation ratio, which chance in stretches of few points
//   does not lift; blind to what wriggles within a stretch. Totals cannot be had from plain draws.
// Interval of 95 %: estimate +- 1.96 standard errors of the bootstrap over base points (points), group_sums.hpp. Points of a sequence
// are more even than independent ones: then it is on the safe side. Kelley takes off a chance that they do not have, M / N at most:
// by that the interval of plain draws from a sequence reaches further up.
//
// Sources: I.M. Sobol, Math. Model. Comput. Exp. 1, 1993, 407-414; A. Saltelli, P. Annoni, I. Azzini, F. Campolongo, M. Ratto,
// S. Tarantola, Comput. Phys. Commun. 181, 2010, 259-270 (first order); M.J.W. Jansen, Comput. Phys. Commun. 117, 1999, 35-43
// (total); T.L. Kelley, Proc. Natl. Acad. Sci. 21(9), 1935, 554-559; E. Plischke, E. Borgonovo, C.L. Smith, Eur. J. Oper. Res.
// 226(3), 2013, 536-550 (from given data); G.E.B. Archer, A. Saltelli, I.M. Sobol, J. Stat. Comput. Simul. 58(2), 1997, 99-120
// (bootstrap of indices).
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "sim/sweep/group_sums.hpp"

namespace slipbench {

struct Share {
  double value = 0.0, low = 0.0, high = 0.0;  // low, high: the interval; it may reach past 0 and 1
};

struct KeyShares {
  Share first;
  std::optional<Share> total;  // of a Saltelli plan
};

struct Sensitivity {
  std::uint64_t used = 0, lost = 0;  // base points, or points of plain draws; lost: an output was missing
  std::vector<KeyShares> keys;       // in the order in which they are drawn; empty where `none` says why
  std::string none;
};

// Of fewer points nothing is told.
inline constexpr std::uint64_t least_points = 8;

class SaltelliIndices {
 public:
  SaltelliIndices(std::uint64_t base_points, std::size_t keys);
  // The keys + 2 outputs of a base point in the order of its cases: A, B, A with key 0 of B, ...; NaN: missing. Each base point once at
  // most; one that never comes counts as lost.
  void add(std::uint64_t base_point, std::span<const double> outputs);
  [[nodiscard]] Sensitivity result(std::uint64_t seed) const;

 private:
  std::uint64_t points_, used_ = 0;
  std::size_t keys_;
  GroupSums sums_;
  double shift_ = 0.0;  // the first output, taken off all: nothing cancels
};

class BinnedIndices {
 public:
  BinnedIndices(std::uint64_t points, std::size_t keys, bool from_sequence);
  // u: the point in the unit cube, of `keys` coordinates.
  void add(std::uint64_t point, std::span<const double> u, double output);
  [[nodiscard]] Sensitivity result(std::uint64_t seed) const;

 private:
  std::uint64_t points_, used_ = 0;
  std::size_t keys_, bins_;
  bool from_sequence_;
  GroupSums sums_;
  double shift_ = 0.0;
};

}  // namespace slipbench
