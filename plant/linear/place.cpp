#include "plant/linear/place.hpp"

#include <Eigen/Dense>
#include <algorithm>
#include <cstdio>

#include "plant/linear/balance.hpp"
#include "plant/linear/dense.hpp"
#include "plant/linear/pbh.hpp"
#include "plant/linear/pole_set.hpp"
#include "plant/linear/robust_eigenvectors.hpp"
#include "plant/linear/schur.hpp"
#include "plant/linear/staircase.hpp"

namespace slipbench::linear {
namespace {

using Index = Eigen::Index;

std::string short_text(double value) {
  char text[32];
  std::snprintf(text, sizeof text, "%.2g", value);
  return text;
}

// Ackermann's formula for H upper Hessenberg and b along e_1: the row e_n' prod(H - p I), divided on the way by what each factor
// brings in, so that nothing overflows.
Matrix ackermann(const Matrix& H, double b, const std::vector<Complex>& poles) {
  const auto n = H.rows();
  Eigen::RowVectorXd row = Eigen::RowVectorXd::Zero(n);
  row(n - 1) = 1.0;
  Index done = 0;
  const auto divide = [&](Index steps) {
    for (Index k = 0; k < steps; ++k, ++done) row /= done + 1 < n ? H(n - 1 - done, n - 2 - done) : b;
  };
  for (std::size_t i = 0; i < poles.size(); ++i) {
    const auto p = poles[i];
    if (p.imag() == 0.0) {
      row = (row * H - p.real() * row).eval();
      divide(1);
      continue;
    }
    const Eigen::RowVectorXd once = row * H;
    row = (once * H - 2.0 * p.real() * once + std::norm(p) * row).eval();
    divide(2);
    ++i;
  }
  return row;
}

Matrix place_single(const Matrix& A, const Matrix& b, const std::vector<Complex>& poles) {
  const auto stairs = controllable_staircase(A, b);
  const Matrix H = stairs.T.transpose() * A * stairs.T, first = stairs.T.transpose() * b;
  return ackermann(H, first(0), poles) * stairs.T.transpose();
}

// More often repeated than there are inputs: a fixed feedback F makes the plant reachable through one direction v.
Matrix place_through_one(const Matrix& A, const Matrix& B, const std::vector<Complex>& poles) {
  const auto n = A.rows(), r = B.cols();
  const double size = A.norm() > 0.0 ? A.norm() : 1.0;
  Matrix best_F;
  Vector best_v;
  double best = 0.0;
  for (int attempt = 0; attempt < 24; ++attempt) {
    Matrix F(r, n);
    Vector v(r);
    // Any numbers will do but for a set of measure zero; these are spread by the golden ratio.
    const auto spread = [&](Index k) {
      const double x = 0.6180339887498949 * static_cast<double>(k + 1 + 31 * attempt);
      return 2.0 * (x - static_cast<double>(static_cast<Index>(x))) - 1.0;
    };
    for (Index i = 0; i < r; ++i) v(i) = spread(i);
    for (Index i = 0; i < r * n; ++i) F(i % r, i / r) = (attempt % 4) * 0.25 * size * spread(r + i * i);
    if (v.norm() == 0.0) continue;
    const auto stairs = controllable_staircase(A - B * F, B * v);
    if (stairs.rank == n && stairs.smallest_kept > best) best = stairs.smallest_kept, best_F = F, best_v = v;
  }
  if (best == 0.0) throw LinearError("the repeated poles " + text_of(poles) + " can't be placed: part them a little");
  return best_F + best_v * place_single(A - B * best_F, B * best_v, poles);
}

struct Gain {
  Matrix K;
  double condition = 0.0;  // 0: not known yet
  std::string warning;
};

// (A, B) controllable.
Gain place_controllable(const Matrix& A, const Matrix& B, const Vector& input_scale,
                        const std::vector<Complex>& poles) {
  const auto n = A.rows();
  const auto parts = svd(B * input_scale.asDiagonal());
  Index r = 0;
  while (r < parts.s.size() && parts.s(r) > rank_tolerance(n, B.cols()) * parts.s(0)) ++r;
  const Matrix range = parts.U.leftCols(r);
  const Matrix back = input_scale.asDiagonal() * parts.V.leftCols(r) * parts.s.head(r).cwiseInverse().asDiagonal();
  if (r == 1) return {back * place_single(A, range, poles), 0.0, ""};
  const auto chosen = robust_eigenvectors(A, parts.U.rightCols(n - r), poles);
  if (chosen.condition < 1e12) {
    const Matrix moved = chosen.X.transpose().fullPivLu().solve((chosen.X * chosen.blocks).transpose()).transpose();
    return {back * range.transpose() * (A - moved), chosen.condition, ""};
  }
  return {back * place_through_one(A, range, poles), 0.0,
          "the repeated poles leave no full set of eigenvectors with " + std::to_string(r) +
              " independent inputs: they are sensitive to every error of the plant"};
}

// Takes the uncontrollable modes out of the wish; each must be there.
std::vector<Complex> without_unmoved(std::vector<Complex> wished, const std::vector<Complex>& unmoved,
                                     const std::string& word) {
  double largest = 0.0;
  for (const auto p : wished) largest = std::max(largest, magnitude(p));
  for (const auto p : unmoved) largest = std::max(largest, magnitude(p));
  for (const auto p : unmoved) {
    const auto nearest = std::min_element(wished.begin(), wished.end(),
                                          [&](Complex a, Complex b) { return magnitude(a - p) < magnitude(b - p); });
    if (nearest == wished.end() || magnitude(*nearest - p) > 1e-6 * std::max(magnitude(p), 1e-3 * largest))
      throw LinearError("the mode at " + text_of(p) + " is " + word +
                        ": it stays where it is; put it among the wished poles (" + text_of(wished) +
                        " are left for it) or leave its state out");
    wished.erase(nearest);
  }
  return paired(wished);
}

double condition_of_eigenvectors(const Matrix& A) {
  if (A.rows() == 0) return 1.0;
  return [](const Vector& s) {
    return s.minCoeff() > 0.0 ? s.maxCoeff() / s.minCoeff() : 1e300;
  }(singular_values(eigenpairs(A).vectors));
}

// Such poles are rounding's, not the wish's: they may well grow.
[[noreturn]] void refuse_lost(const Matrix& A, const Matrix& B, const StateFeedback& f, const std::string& word) {
  const auto tests = pbh({A, B, Matrix::Zero(0, A.rows()), Matrix::Zero(0, B.cols()), 0.0, {}, {}, {}});
  const auto least = std::min_element(tests.begin(), tests.end(), [](const ModeTest& a, const ModeTest& b) {
    return a.controllability < b.controllability;
  });
  throw LinearError("the mode at " + text_of(least->pole) + " is all but " + word + ": moving it takes gains up to " +
                    short_text(f.K.cwiseAbs().maxCoeff()) + ", whose rounding puts poles at " + text_of(f.poles) +
                    ", off the wish by " + short_text(f.residual) + " relative");
}

}  // namespace

StateFeedback place(const Matrix& A, const Matrix& B, const std::vector<Complex>& poles, const std::string& unmoved) {
  const auto n = A.rows();
  for (const auto p : poles)
    if (!(magnitude(p) < 1e300)) throw LinearError("a wished pole is not finite");
  if (static_cast<Index>(poles.size()) != n)
    throw LinearError(std::to_string(poles.size()) + " poles were wished, but the system has " + std::to_string(n) +
                      (n == 1 ? " state" : " states") + ": one pole a state");
  const auto wished = paired(poles);
  StateFeedback f;
  f.K = Matrix::Zero(B.cols(), n);
  if (n > 0) {
    // Ranks are decided in balanced units: x = diag(state) z, u = diag(input) v.
    System pair;
    pair.A = A;
    pair.B = B;
    pair.C = Matrix::Zero(0, n);
    pair.D = Matrix::Zero(0, B.cols());
    const auto units = in_balanced_units(pair);
    const auto stairs = controllable_staircase(units.system.A, units.system.B);
    const auto r = stairs.rank;
    Gain gain;
    if (r == n && B.cols() > 1) {
      gain = place_controllable(A, B, units.input, wished);
      f.K = gain.K;
    } else {
      const Matrix T = stairs.T, At = T.transpose() * units.system.A * T;
      const auto left = without_unmoved(wished, eigenvalues(At.bottomRightCorner(n - r, n - r)), unmoved);
      if (r > 0) {
        const Matrix Bt = (T.transpose() * units.system.B).topRows(r);
        gain = place_controllable(At.topLeftCorner(r, r), Bt, Vector::Ones(B.cols()), left);
        const auto inverse = units.state.cwiseInverse().asDiagonal();
        f.K = units.input.asDiagonal() * gain.K * T.leftCols(r).transpose() * inverse;
      }
    }
    f.warning = gain.warning;
    f.condition = r == n && gain.condition > 0.0 ? gain.condition : condition_of_eigenvectors(A - B * f.K);
  }
  f.poles = eigenvalues(A - B * f.K);
  double moved = 0.0;
  for (const auto p : eigenvalues(A)) moved = std::max(moved, magnitude(p));
  f.residual = pole_distance(wished, f.poles, moved);
  if (f.residual > 0.1) refuse_lost(A, B, f, unmoved);
  if (f.warning.empty() && f.residual > 1e-6)
    f.warning = "the achieved poles differ from the wished ones by " + short_text(f.residual) +
                " relative (condition of the eigenvectors " + short_text(f.condition) +
                "): repeated or far-moved poles are sensitive to rounding and to every error of the plant";
  return f;
}

StateFeedback place(const System& given, const std::vector<Complex>& poles) {
  const auto s = checked(given);
  return place(s.A, s.B, poles);
}

}  // namespace slipbench::linear
