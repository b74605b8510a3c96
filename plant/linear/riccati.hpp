// Algebraic Riccati equations, continuous and discrete: the stabilising solution, how good it is and how far to trust it.
//
//   care:  A'X + X A - (X B + N) R^-1 (X B + N)' + Q = 0            closed loop A - B K,  K = R^-1 (B'X + N')
//   dare:  A'X A - X - (A'X B + N)(R + B'X B)^-1 (A'X B + N)' + Q = 0,  K = (R + B'X B)^-1 (B'X A + N')
//
// A n x n, B n x m, Q n x n symmetric (may be indefinite), R m x m symmetric (care: invertible; dare: may be singular, even
// zero, as long as R + B'X B is invertible), N n x m (empty: zero). X n x n symmetric.
// Way: the extended pencil of 2n + m rows is compressed by an orthogonal transformation, so that R is never inverted; the
// discrete one is mapped to the half plane by a Cayley transformation; balanced; ordered complex Schur form; then Newton
// steps (Kleinman) while they lower the residual.
// Trust: residual is the norm of the left side over the sum of its terms' norms; condition bounds how much larger the
// relative error of X can be than that of the data (first order); a warning stands where condition * 2^-52 > 1e-6
// (a closed-loop pole near the stability limit brings that about), or the residual > 1e-10.
// LinearError: shapes; not symmetric; R singular (care), R + B'X B singular (dare); no stabilising solution, naming the
// eigenvalue on the stability limit.
// Sources: A.J. Laub, IEEE TAC 24(6) 1979, 913-921; P. Van Dooren, SIAM J. Sci. Stat. Comput. 2 1981, 121-135; D. Kleinman,
// IEEE TAC 13 1968, 114-115; condition after C. Kenney, G. Hewer, SIAM J. Control Optim. 28 1990, 50-69.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct Riccati {
  Matrix X;                // n x n, stabilising, symmetric
  Matrix K;                // m x n
  double residual = 0.0;   // relative
  double condition = 1.0;  // relative
  std::vector<Complex> closed_loop_poles;
  std::string warning;  // empty: nothing to warn of
};

Riccati care(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N = {});
Riccati dare(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N = {});

// The left side of the equation at any X, n x n.
Matrix care_residual(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N,
                     const Matrix& X);
Matrix dare_residual(const Matrix& A, const Matrix& B, const Matrix& Q, const Matrix& R, const Matrix& N,
                     const Matrix& X);

}  // namespace slipbench::linear
