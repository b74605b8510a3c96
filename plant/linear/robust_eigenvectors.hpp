// Eigenvectors of a closed loop with the wished poles, chosen as nearly orthogonal as the plant allows.
//
//   x_i in S_i = ker(U'(A - p_i I)), |x_i| = 1; maximise |det X|, two columns at a time with the others held:
//   two real ones  max |w1' (S1'Q) J (Q'S2) w2|, Q the complement of the other columns, J = [0 1; -1 0]: a singular value
//   a pair x, conj x  max |w^H (S^H Q) (i J / 2) (Q'S) w|: an eigenvalue of a Hermitian matrix
//
// A n x n, U n x (n - r) the orthonormal complement of B's range of dimension r. poles as paired() gives them.
// X n x n real: a real pole's vector, or sqrt 2 times real and imaginary part of a pair's; blocks n x n with A_closed X = X blocks.
// From several fixed starts the best conditioned is kept. condition is kappa_2(X) (of the complex vectors: the same); infinite where no
// full set of eigenvectors was found.
// Source: A.L. Tits, Y. Yang, IEEE TAC 41(10) 1996, 1432-1452.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct Eigenvectors {
  Matrix X, blocks;
  double condition = 1.0;
};

Eigenvectors robust_eigenvectors(const Matrix& A, const Matrix& U, const std::vector<Complex>& poles);

}  // namespace slipbench::linear
