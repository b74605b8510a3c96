// Checks of weights and covariances, with sentences: shape, symmetry, definiteness, and modes on the stability limit that a weight
// does not see.
//
// A matrix counts as semidefinite down to -1e-12 of its largest eigenvalue's magnitude, as definite above +1e-14 of it: a computed
// covariance is rounded. A mode is on the limit within 1e-10 of its matrix's norm (discrete: of the circle).
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

// size x size, finite, symmetric to 1e-10.
void expect_weight(const char* name, const Matrix& weight, Eigen::Index size);
void expect_definite(const char* name, const Matrix& weight);
void expect_semidefinite(const char* name, const Matrix& weight);
double smallest_eigenvalue(const Matrix& symmetric);  // of an empty matrix: 1

// LinearError "the mode at 0 ... on the imaginary axis (mostly x1) " + why, where (A, seen) has an unobservable mode there.
void refuse_unseen_limit(const Matrix& A, const Matrix& seen, bool discrete, const std::string& why,
                         const System& names);

}  // namespace slipbench::linear
