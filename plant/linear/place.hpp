// Pole placement: K so that A - B K has the wished poles, u = -K x; continuous and discrete alike.
//
// One input (or one independent column of B): Ackermann's formula in the coordinates of the controllable staircase, where the
// inverse of the controllability matrix is a product of subdiagonals: the same gain, better conditioned,
//   K = e_n' prod (H - p_i I) / (b_1 prod h_(i+1,i)) T.
// Several: the eigenvectors are chosen from S_i = ker(U_1'(A - p_i I)), U_1 the complement of B's range, to maximise
// |det X| over unit columns, two columns (or one conjugate pair) at a time, each step exact; K = B^+ (A - X L X^-1).
// The gain is not unique; its eigenvectors' condition kappa_2(X) is reported, and scales with the units of the states.
// A pole repeated more often than there are independent inputs has no full set of eigenvectors: a fixed feedback first
// makes the plant reachable from one direction of the inputs, then as for one input, with a warning.
// Uncontrollable modes stay where they are: each must be among the wished poles, to 1e-6 relative.
// poles: n of them, closed under conjugation, any order.
// residual of the answer: pole_distance(wished, achieved, largest open-loop pole); a warning above 1e-6, a refusal above 0.1.
// LinearError: number of poles; a conjugate missing; an uncontrollable mode that was not wished, named.
// Sources: J. Kautsky, N.K. Nichols, P. Van Dooren, Int. J. Control 41(5) 1985, 1129-1155; A.L. Tits, Y. Yang, IEEE TAC 41(10)
// 1996, 1432-1452; J. Ackermann, Regelungstechnik 20 1972, 297-300; M. Heymann, IEEE TAC 13 1968, 748-749.
#pragma once

#include "plant/linear/lqr.hpp"

namespace slipbench::linear {

StateFeedback place(const System& system, const std::vector<Complex>& poles);

// The same for a pair of matrices; unmoved is the word for a mode that stays: "unobservable" suits the dual.
StateFeedback place(const Matrix& A, const Matrix& B, const std::vector<Complex>& poles,
                    const std::string& unmoved = "uncontrollable");

}  // namespace slipbench::linear
