// The stable deflating subspace of a Riccati equation's pencil, and X = U2 U1^-1 from its basis [U1; U2].
//
//   continuous  M = [A 0 B; -Q -A' -N; N' B' R],  L = diag(I, I, 0)
//   discrete    M = [A 0 B; -Q I -N; N' 0 R],     L = [I 0 0; 0 A' 0; 0 -B' 0]
//
// of 2n + m rows, compressed to 2n by an orthogonal transformation that takes the column [B; -N; R] away. Continuous: S = L^-1 M;
// discrete: S = (M + s L)^-1 (M - s L), s = +-1 whichever is conditioned better, which takes the unit disk to the left half plane. Ordered complex
// Schur form of S. X is not refined here.
// LinearError: an eigenvalue on the stability limit, named.
// Source: P. Van Dooren, SIAM J. Sci. Stat. Comput. 2 1981, 121-135.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

// n x n, symmetric.
Matrix riccati_subspace(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N,
                        bool discrete);

// Scales d, powers of two, of x = diag(d) z that bring rows and columns of the pencil to like size.
Vector riccati_balance(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R);

}  // namespace slipbench::linear
