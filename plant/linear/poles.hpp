// Poles and what they mean, and whether the system is stable.
//
// A pole p = -d w + j w sqrt(1 - d^2): frequency w = |p| in rad/s, damping d = -Re p / |p| (0 at p = 0), time constant
// -1/Re p in s (infinite on the axis, negative when it grows). A discrete pole z means p = log(z) / sample_period_s, its
// principal value; z = 0 (dead beat) has damping 1, infinite frequency, time constant 0.
//
// Stable: every pole left of the axis (inside the circle) by more than the tolerance; marginal: some pole within it and no
// Jordan block there; unstable: else. The tolerance is 64 times what rounding moves the pole by, n eps ||A|| / |y'x|
// (A balanced, y and x its left and right unit eigenvectors). Poles closer to each other than rounding can tell
// ((n eps)^(1/k) ||A|| for k of them) are one repeated pole at their mean when A - p I has fewer than k null directions.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct Mode {
  Complex pole;
  double damping = 0.0, frequency_rad_s = 0.0, time_constant_s = 0.0;
};

// By real part (magnitude when discrete), largest first; of a pair the one above the axis first.
std::vector<Mode> modes_of(const System& system);

// Its meaning for a single pole; sample_period_s = 0: continuous.
Mode mode_of(Complex pole, double sample_period_s);

enum class Stability { stable, marginal, unstable };
const char* name_of(Stability stability);  // "stable", "marginal", "unstable"

struct Verdict {
  Stability stability = Stability::stable;
  std::string why;         // names the deciding mode
  double tolerance = 0.0;  // distance from the axis (circle) that counts as on it
};
Verdict stability_of(const System& system);

// Poles that rounding can't tell apart, as one: their mean, how many, how many null directions of A - mean I. In the
// order of eigenvalues().
struct PoleGroup {
  Complex pole;
  Eigen::Index count = 1, eigenvectors = 1;
  double spread = 0.0;       // largest distance of a computed pole from the mean
  double uncertainty = 0.0;  // how far rounding may have moved it (the mean, when repeated)
};
std::vector<PoleGroup> pole_groups(const Matrix& a);

}  // namespace slipbench::linear
