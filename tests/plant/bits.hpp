// Equality of bits, for tests: two numbers are the same if they are to the sign of zero; of a NaN only that it is one counts.
#pragma once

#include <bit>
#include <cstdint>
#include <type_traits>

namespace slipbench {

template <class T>
auto bits_of(T x) {
  using Bits = std::conditional_t<sizeof(T) == 8, std::uint64_t, std::uint32_t>;
  return std::bit_cast<Bits>(x);
}
template <class T>
bool same_bits(T a, T b) {
  return (a != a && b != b) || bits_of(a) == bits_of(b);
}

// FNV-1a over the bytes of numbers, little end first. Constants: G. Fowler, L.C. Noll, K.-P. Vo, IETF draft "The FNV
// Non-Cryptographic Hash Algorithm".
class Fnv {
 public:
  template <class T>
  void add(T x) {
    auto bits = bits_of(x);
    for (std::size_t i = 0; i < sizeof x; ++i, bits >>= 8) hash_ = (hash_ ^ (bits & 0xffu)) * 0x100000001b3u;
  }
  [[nodiscard]] std::uint64_t value() const { return hash_; }

 private:
  std::uint64_t hash_ = 0xcbf29ce484222325u;
};

}  // namespace slipbench
