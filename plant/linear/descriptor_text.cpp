#include "plant/linear/descriptor_text.hpp"

#include <algorithm>
#include <cmath>
#include <cstdio>

#include "plant/linear/dense.hpp"

namespace slipbench::linear {
namespace {

// Adds " + 2 x1" for a coefficient that is not rounding beside `size`.
void add_term(double coefficient, double size, const std::string& name, std::string* text) {
  if (std::fabs(coefficient) <= trusted_digits * size) return;
  char number[40];
  const double shown = std::fabs(coefficient);
  const char* sign = text->empty() ? (coefficient < 0.0 ? "-" : "") : (coefficient < 0.0 ? " - " : " + ");
  if (std::fabs(shown - 1.0) <= trusted_digits)
    std::snprintf(number, sizeof number, "%s", sign);
  else
    std::snprintf(number, sizeof number, "%s%.6g ", sign, shown);
  *text += number + name;
}

double largest(const Matrix& row) { return row.size() == 0 ? 0.0 : row.cwiseAbs().maxCoeff(); }

std::string primes(std::size_t order, bool discrete) {
  return discrete ? "[k+" + std::to_string(order) + "]" : std::string(order, '\'');
}

}  // namespace

std::string undetermined_text(const System& given, const Vector& variables, const Vector& equations) {
  System rows;
  for (Eigen::Index i = 0; i < equations.size(); ++i) rows.state_names.push_back("row " + std::to_string(i + 1));
  return "the pencil is singular: the equations leave " + direction_text(given, variables) +
         " undetermined, and say too much in " + direction_text(rows, equations);
}

void refuse_improper(const System& given, const Matrix& derivative, const Matrix& jump, int order) {
  const Matrix seen = given.C * derivative;
  for (Eigen::Index i = 0; i < seen.rows(); ++i)
    for (Eigen::Index j = 0; j < seen.cols(); ++j) {
      const double size =
          given.C.row(i).norm() * std::max(derivative.col(j).norm(), trusted_digits * jump.col(j).norm());
      if (std::fabs(seen(i, j)) <= 1e-9 * size) continue;
      throw LinearError("the system is improper (index " + std::to_string(order + 1) + " or more): output " +
                        given.output_name(i) + " would follow " +
                        (given.discrete() ? "future values"
                         : order == 1     ? "the derivative"
                                          : "a higher derivative") +
                        " of input " + given.input_name(j));
    }
}

void tell(const System& given, const Matrix& E, const Matrix& all, const Matrix& jump,
          const std::vector<Matrix>& derivatives, const std::vector<Eigen::Index>& keep, Reduced* out) {
  out->system.state_names.clear();
  for (const auto i : keep) {
    const bool jumps = largest(jump.row(i)) > trusted_digits * std::max(1.0, largest(jump));
    out->system.state_names.push_back(given.state_name(i) + (jumps ? " less its jump" : ""));
  }
  for (Eigen::Index i = 0; i < given.order(); ++i) {
    if (std::find(keep.begin(), keep.end(), i) != keep.end()) continue;
    std::string sum;
    double size = std::max(largest(all.row(i)), largest(jump.row(i)));
    for (const Matrix& d : derivatives) size = std::max(size, largest(d.row(i)));
    for (std::size_t k = 0; k < keep.size(); ++k)
      add_term(all(i, static_cast<Eigen::Index>(k)), size, given.state_name(keep[k]), &sum);
    for (Eigen::Index j = 0; j < given.inputs(); ++j) {
      double own = jump(i, j);
      // A kept variable that jumps stands in the sum whole: its jump is not said twice.
      for (std::size_t k = 0; k < keep.size(); ++k) own -= all(i, static_cast<Eigen::Index>(k)) * jump(keep[k], j);
      add_term(own, size, given.input_name(j), &sum);
    }
    for (std::size_t d = 0; d < derivatives.size(); ++d)
      for (Eigen::Index j = 0; j < given.inputs(); ++j)
        add_term(derivatives[d](i, j), size, given.input_name(j) + primes(d + 1, given.discrete()), &sum);
    const bool no_derivative = E.col(i).isZero(0.0);
    const char* why = no_derivative    ? "no equation holds its derivative"
                      : out->index > 1 ? "a constraint ties it to the others, so that its derivative is not free"
                                       : "its derivative comes only together with others' (E is singular)";
    out->redundant.push_back(
        {given.state_name(i), given.state_name(i) + " = " + (sum.empty() ? "0" : sum) + ": " + why});
  }
}

}  // namespace slipbench::linear
