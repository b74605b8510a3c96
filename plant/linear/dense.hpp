// Small helpers on dense matrices that may be empty: singular values, ranks, complex numbers without the C library.
//
// Eigen's decompositions are not made for 0 x n matrices; these are, and none calls more of the C library than sqrt.
#pragma once

#include "plant/linear/system.hpp"

namespace slipbench::linear {

// Entries are trusted to twelve digits: what a linearisation or a file of computed numbers keeps. A rank decision on an
// n x m matrix calls a singular value zero below rank_tolerance(n, m) times the matrix's norm.
inline constexpr double trusted_digits = 1e-12;
double rank_tolerance(Eigen::Index rows, Eigen::Index columns);  // 1e-12 max(1, rows, columns)

// M = U diag(s) V^H, U and V square and unitary, s falling, min(rows, columns) of them. Any size.
struct Svd {
  Matrix U, V;
  Vector s;
};
Svd svd(const Matrix& m);
Vector singular_values(const Matrix& m);
Vector singular_values(const ComplexMatrix& m);
double largest_singular_value(const Matrix& m);  // 2-norm; 0 for an empty matrix
double condition_number(const Matrix& m);        // 1 for an empty matrix, infinity if singular
Eigen::Index rank_of(const Matrix& m, double absolute_tolerance);
double one_norm(const Matrix& m);

double magnitude(Complex z);  // no overflow between
Complex exponential_of(Complex z);
Complex logarithm_of(Complex z);    // principal; -infinity at 0
Complex unit_at(double angle_rad);  // e^(j angle)

// Eigenvalues of a real matrix, balanced before, conjugates exact, larger real part first (then larger imaginary).
std::vector<Complex> eigenvalues(const Matrix& a);

// "x2", or "a combination of x1 (0.71), x3 (-0.70)": the state that a direction (any scale) mostly is, or its largest
// weights. One state is enough where the rest holds less than a tenth of the squared length.
std::string direction_text(const System& system, const Vector& direction);

}  // namespace slipbench::linear
