// Points of the unit cube for drawn plans: case k, key j of d, each coordinate in (0, 1), a pure function of (seed, k), so that
// any shard makes its own cases.
//
//   random           u = Philox(k, j)
//   latin_hypercube  u = (P_j(k) + Philox(k, j)) / n: P_j a random permutation of the n strata, one a key
//   sobol            the k-th point of the sequence after its origin, moved by a random shift modulo 1 of each key where seed > 0
//   saltelli         d + 2 cases a base point: A, B, then A with one key after the other taken from B; (A, B) is a sobol point in 2 d
//
// Sources: M.D. McKay, R.J. Beckman, W.J. Conover, Technometrics 21(2), 1979, 239-245 (Latin hypercube); I.M. Sobol, USSR Comput.
// Math. Math. Phys. 7(4), 1967, 86-112; R. Cranley, T.N.L. Patterson, SIAM J. Numer. Anal. 13(6), 1976, 904-914 (shift);
// A. Saltelli et al., Comput. Phys. Commun. 181, 2010, 259-270 (the design A, B, A_B). Sequence: Boost.Random.
#pragma once

#include <cstdint>
#include <memory>
#include <string_view>
#include <vector>

namespace slipbench {

enum class DrawKind { random, latin_hypercube, sobol, saltelli };

// Most keys that the sequences serve; saltelli takes two coordinates a key.
inline constexpr std::size_t most_drawn_keys = 1000;

class Draws {
 public:
  // n: points asked for (saltelli: base points); 1 <= keys <= most_drawn_keys.
  Draws(DrawKind kind, std::uint64_t n, std::size_t keys, std::uint64_t seed);
  ~Draws();
  Draws(const Draws&) = delete;
  Draws& operator=(const Draws&) = delete;

  [[nodiscard]] std::uint64_t cases() const;
  // Case k < cases(). Rising k costs O(keys) a case.
  [[nodiscard]] const std::vector<double>& point(std::uint64_t k);

 private:
  struct Sequence;
  void sobol_point(std::uint64_t k);
  [[nodiscard]] double uniform(std::uint64_t k, std::uint32_t j, std::uint32_t use) const;

  DrawKind kind_;
  std::uint64_t n_, seed_;
  std::size_t keys_;
  std::unique_ptr<Sequence> sequence_;
  std::vector<double> shift_, raw_, point_;
};

// A permutation of 0 .. n-1 that needs no table: a Feistel network over the next power of four, walked until it lands below n.
// (M. Luby, C. Rackoff, SIAM J. Comput. 17(2), 1988, 373-386; J. Black, P. Rogaway, CT-RSA 2002: cycle walking.)
std::uint64_t permuted(std::uint64_t k, std::uint64_t n, std::uint64_t seed, std::uint32_t which);

// Quantile of the standard normal distribution, 0 < p < 1; relative error below 1e-15 (M.J. Wichura, "Algorithm AS 241", Applied
// Statistics 37(3), 1988, 477-484, PPND16). The same bits on every processor.
double normal_quantile(double p);

}  // namespace slipbench
