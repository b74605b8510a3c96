// Real Schur form and eigenpairs of a real matrix, sure to be found.
//
//   S = U T U', U orthogonal, T with blocks of one real or two conjugate eigenvalues;   S v = lambda v, |v| = 1
//
// The real QR iteration can go round in circles, above all where every eigenvalue is double, as those of a machine's d-q frame: the same
// matrix seen through another reflection, H S H, leads it out. Source: G.H. Golub, C.F. Van Loan, "Matrix Computations", sec. 7.5.
// LinearError where it is still not found: S is not finite.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

struct RealSchurForm {
  Matrix U, T;
};
RealSchurForm real_schur(const Matrix& S);

struct Eigenpairs {
  Eigen::VectorXcd values;
  ComplexMatrix vectors;  // columns
};
Eigenpairs eigenpairs(const Matrix& S);

}  // namespace slipbench::linear
