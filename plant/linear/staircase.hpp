// Controllable and observable parts by orthogonal staircase.
//
//   controllable: T'A T = [A11 A12; 0 A22], T'B = [B1; 0], A11 rank x rank, (A11, B1) controllable
//   observable:   T'A T = [A11 0; A21 A22], C T = [C1 0], (A11, C1) observable
//
// x = T z; A n x n, B n x m, C p x n, T n x n orthogonal. The first `rank` columns of T span the controllable subspace
// (observable: the others span the unobservable one). blocks: the ranks of the steps, falling. A singular value is zero
// below tolerance ||B||_F in the first step and tolerance ||A||_F in the next ones: the rank of B is not the unit's doing.
// Rounding that has grown beyond it over weak steps (64 n eps over the product of their relative sizes, at most 1e-8) takes
// the tolerance's place: past that a coupling can't be told from none. A Newton step on the subspace then mends it.
// Source: P. Van Dooren, "The generalized eigenstructure problem in linear system theory", IEEE TAC 26, 1981.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct Staircase {
  Matrix T;
  Eigen::Index rank = 0;
  std::vector<Eigen::Index> blocks;
  double tolerance = 0.0;        // relative, the last step's
  double smallest_kept = 1.0;    // relative size of the smallest singular value that counted: how near the next rank is
  double largest_dropped = 0.0;  // and of the largest that did not
};

// tolerance 0: rank_tolerance(n, n). As given: no balancing here.
Staircase controllable_staircase(const Matrix& A, const Matrix& B, double tolerance = 0.0);
Staircase observable_staircase(const Matrix& A, const Matrix& C, double tolerance = 0.0);

// The same with the sizes of A and B to compare with: for a block of a larger pair, which may be all rounding.
Staircase controllable_part(const Matrix& A, const Matrix& B, double tolerance, double size_a, double size_b);

// Ranks of a system, decided in balanced units; warning (else empty) where the given units would decide otherwise.
struct Ranks {
  Eigen::Index controllable = 0, observable = 0;
  double tolerance = 0.0;
  std::string warning;
};
Ranks ranks_of(const System& system);

}  // namespace slipbench::linear
