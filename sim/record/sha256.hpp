// SHA-256 of a stream of bytes. Source: NIST FIPS 180-4, "Secure Hash Standard", 2015, sections 4.1.2, 5 and 6.2.
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <span>
#include <string>

namespace slipbench {

class Sha256 {
 public:
  void add(std::span<const std::uint8_t> bytes);
  // Digest of all bytes so far, as 64 lower-case hexadecimal digits; more bytes may follow.
  [[nodiscard]] std::string hex() const;

 private:
  void compress(const std::uint8_t* block);

  std::array<std::uint32_t, 8> state_ = {0x6a09e667, 0xbb67ae85, 0x3c6ef372, 0xa54ff53a,
                                         0x510e527f, 0x9b05688c, 0x1f83d9ab, 0x5be0cd19};
  std::array<std::uint8_t, 64> pending_{};
  std::uint64_t length_ = 0;  // bytes
};

}  // namespace slipbench
