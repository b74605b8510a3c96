// Sylvester, Lyapunov and Stein equations by real Schur form.
//
//   sylvester(A, B, Q):  A X + X B + Q = 0      A n x n, B m x m, Q and X n x m
//   lyapunov(A, Q):      A X + X A' + Q = 0     Q n x n; a symmetric Q gives a symmetric X
//   stein(A, Q):         A X A' - X + Q = 0
//
// LinearError where a solution is not there or not the only one: it names the two poles with p_i + p_j = 0 (p_i p_j = 1).
// Source: R.H. Bartels, G.W. Stewart, CACM 15, 1972; A.Y. Barraud, IEEE TAC 22, 1977 for Stein's.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

Matrix sylvester(const Matrix& A, const Matrix& B, const Matrix& Q);
Matrix lyapunov(const Matrix& A, const Matrix& Q);
Matrix stein(const Matrix& A, const Matrix& Q);

// What is left over, relative to the sizes that went in: ||A X + X A' + Q||_F / (2 ||A|| ||X|| + ||Q||), Stein's with
// ||A||^2 ||X|| + ||X|| + ||Q||. A few n eps when all went well, whatever the condition. 0 for empty matrices.
double lyapunov_residual(const Matrix& A, const Matrix& X, const Matrix& Q);
double stein_residual(const Matrix& A, const Matrix& X, const Matrix& Q);

}  // namespace slipbench::linear
