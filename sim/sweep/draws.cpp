#include "sim/sweep/draws.hpp"

#include <boost/random/sobol.hpp>
#include <stdexcept>

#include "plant/math/elementary.hpp"
#include "sim/engine/noise.hpp"

namespace slipbench {

namespace {

// What the words are for, so that no two uses share them; noise channels are told apart by hashes of names, these by the fourth
// word, which counts runs there.
enum Use : std::uint32_t { value = 0x53574550u, stratum, rounds, shift };

constexpr std::array<std::uint32_t, 4> words_of(std::uint64_t count, std::uint32_t j, std::uint32_t use,
                                                std::uint64_t seed) {
  return philox4x32_10({static_cast<std::uint32_t>(count), static_cast<std::uint32_t>(count >> 32), j, use},
                       {static_cast<std::uint32_t>(seed), static_cast<std::uint32_t>(seed >> 32)});
}

// (0, 1], exact, brought below 1.
double open_uniform(const std::array<std::uint32_t, 4>& w) {
  const double u = uniform_from_words(w[0], w[1]);
  return u < 1.0 ? u : 1.0 - 0x1p-53;
}

}  // namespace

struct Draws::Sequence {
  explicit Sequence(std::size_t dimensions) : engine(dimensions) {}
  boost::random::sobol engine;
  std::uint64_t next = 0;
};

Draws::Draws(DrawKind kind, std::uint64_t n, std::size_t keys, std::uint64_t seed)
    : kind_(kind), n_(n), seed_(seed), keys_(keys) {
  if (n == 0 || keys == 0 || keys > most_drawn_keys) throw std::invalid_argument("draws: no points, or too many keys");
  point_.resize(keys_);
  if (kind_ == DrawKind::random || kind_ == DrawKind::latin_hypercube) return;
  const std::size_t dimensions = kind_ == DrawKind::saltelli ? 2 * keys_ : keys_;
  sequence_ = std::make_unique<Sequence>(dimensions);
  raw_.resize(dimensions);
  shift_.assign(dimensions, 0.0);
  for (std::size_t j = 0; j < dimensions && seed_ > 0; ++j)
    shift_[j] = uniform(0, static_cast<std::uint32_t>(j), Use::shift);
}

Draws::~Draws() = default;

std::uint64_t Draws::cases() const { return kind_ == DrawKind::saltelli ? n_ * (keys_ + 2) : n_; }

double Draws::uniform(std::uint64_t k, std::uint32_t j, std::uint32_t use) const {
  return open_uniform(words_of(k, j, use, seed_));
}

void Draws::sobol_point(std::uint64_t k) {
  Sequence& s = *sequence_;
  const std::size_t d = raw_.size();
  if (k + 1 == s.next) return;  // the point at hand
  if (k != s.next) {
    s.engine.seed();
    s.engine.discard(k * d);
  }
  constexpr double per_word = 0x1p-64;
  static_assert(sizeof(boost::random::sobol::result_type) == 8);
  for (std::size_t j = 0; j < d; ++j) {
    // Rounded to double it may reach 1; shifted it may hit 0: both ends are kept out.
    double u = static_cast<double>(s.engine() >> 11) * (per_word * 2048.0) + shift_[j];
    if (u >= 1.0) u -= 1.0;
    raw_[j] = u > 0.0 ? u : 0x1p-54;
  }
  s.next = k + 1;
}

const std::vector<double>& Draws::point(std::uint64_t k) {
  if (k >= cases()) throw std::out_of_range("draws: no such case");
  switch (kind_) {
    case DrawKind::random:
      for (std::uint32_t j = 0; j < keys_; ++j) point_[j] = uniform(k, j, Use::value);
      break;
    case DrawKind::latin_hypercube:
      for (std::uint32_t j = 0; j < keys_; ++j) {
        const auto stratum = static_cast<double>(permuted(k, n_, seed_, j));
        const double u = (stratum + uniform(k, j, Use::stratum)) / static_cast<double>(n_);
        point_[j] = u < 1.0 ? u : 1.0 - 0x1p-53;
      }
      break;
    case DrawKind::sobol:
      sobol_point(k);
      point_ = raw_;
      break;
    case DrawKind::saltelli: {
      sobol_point(k / (keys_ + 2));
      const std::uint64_t which = k % (keys_ + 2);
      for (std::size_t j = 0; j < keys_; ++j) point_[j] = raw_[which == 1 || which == j + 2 ? keys_ + j : j];
      break;
    }
  }
  return point_;
}

std::uint64_t permuted(std::uint64_t k, std::uint64_t n, std::uint64_t seed, std::uint32_t which) {
  std::uint32_t half_bits = 1;
  while (half_bits < 32 && (std::uint64_t{1} << (2 * half_bits)) < n) ++half_bits;
  const std::uint64_t mask = (std::uint64_t{1} << half_bits) - 1;
  do {
    std::uint64_t left = k >> half_bits, right = k & mask;
    for (std::uint32_t round = 0; round < 6; ++round) {
      const auto w = words_of(right | std::uint64_t{round} << 32, which, Use::rounds, seed);
      const std::uint64_t mixed = left ^ (w[0] & mask);
      left = right;
      right = mixed;
    }
    k = left << half_bits | right;
  } while (k >= n);
  return k;
}

double normal_quantile(double p) {
  const auto ratio = [](double r, const std::array<double, 8>& a, const std::array<double, 8>& b) {
    double top = a[7], bottom = b[7];
    for (int i = 6; i >= 0; --i)
      top = top * r + a[static_cast<std::size_t>(i)], bottom = bottom * r + b[static_cast<std::size_t>(i)];
    return top / bottom;
  };
  const double q = p - 0.5;
  if (fabs(q) <= 0.425) {
    constexpr std::array<double, 8> a = {3.3871328727963666080e0,  1.3314166789178437745e+2, 1.9715909503065514427e+3,
                                         1.3731693765509461125e+4, 4.5921953931549871457e+4, 6.7265770927008700853e+4,
                                         3.3430575583588128105e+4, 2.5090809287301226727e+3};
    constexpr std::array<double, 8> b = {1.0,
                                         4.2313330701600911252e+1,
                                         6.8718700749205790830e+2,
                                         5.3941960214247511077e+3,
                                         2.1213794301586595867e+4,
                                         3.9307895800092710610e+4,
                                         2.8729085735721942674e+4,
                                         5.2264952788528545610e+3};
    return q * ratio(0.180625 - q * q, a, b);
  }
  const double r = sqrt(-log(q < 0.0 ? p : 1.0 - p));
  double x = 0.0;
  if (r <= 5.0) {
    constexpr std::array<double, 8> c = {1.42343711074968357734e0,  4.63033784615654529590e0, 5.76949722146069140550e0,
                                         3.64784832476320460504e0,  1.27045825245236838258e0, 2.41780725177450611770e-1,
                                         2.27238449892691845833e-2, 7.74545014278341407640e-4};
    constexpr std::array<double, 8> d = {1.0,
                                         2.05319162663775882187e0,
                                         1.67638483018380384940e0,
                                         6.89767334985100004550e-1,
                                         1.48103976427480074590e-1,
                                         1.51986665636164571966e-2,
                                         5.47593808499534494600e-4,
                                         1.05075007164441684324e-9};
    x = ratio(r - 1.6, c, d);
  } else {
    constexpr std::array<double, 8> e = {
        6.65790464350110377720e0,  5.46378491116411436990e0,  1.78482653991729133580e0,  2.96560571828504891230e-1,
        2.65321895265761230930e-2, 1.24266094738807843860e-3, 2.71155556874348757815e-5, 2.01033439929228813265e-7};
    constexpr std::array<double, 8> f = {1.0,
                                         5.99832206555887937690e-1,
                                         1.36929880922735805310e-1,
                                         1.48753612908506148525e-2,
                                         7.86869131145613259100e-4,
                                         1.84631831751005468180e-5,
                                         1.42151175831644588870e-7,
                                         2.04426310338993978564e-15};
    x = ratio(r - 5.0, e, f);
  }
  return q < 0.0 ? -x : x;
}

}  // namespace slipbench
