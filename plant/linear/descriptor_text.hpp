// The sentences of `reduce`: which variable was redundant and why, what is undetermined, what is improper.
//
//   x = all xi + jump u + derivatives[0] u' + ...    all n x r, jump and derivatives n x m; xi the kept variables
//
// A coefficient below 1e-12 of the largest in its row is rounding and left unsaid.
#pragma once

#include "plant/linear/descriptor.hpp"

namespace slipbench::linear {

// A singular pencil: the null direction among the variables and among the equations.
std::string undetermined_text(const System& given, const Vector& variables, const Vector& equations);

// LinearError where an output holds the input's derivative of that order (1: u').
void refuse_improper(const System& given, const Matrix& derivative, const Matrix& jump, int order);

// Names the states kept, and fills `redundant`.
void tell(const System& given, const Matrix& E, const Matrix& all, const Matrix& jump,
          const std::vector<Matrix>& derivatives, const std::vector<Eigen::Index>& keep, Reduced* out);

}  // namespace slipbench::linear
