// What a link allows: bytes of an exchange, time of them on a serial line.
//
//   t = 10 (b_out + b_back) / baud      8N1: a start bit, eight, a stop bit; sample and answer one after the other
#pragma once

#include <cstddef>

namespace slipbench {

inline constexpr std::size_t sample_wire_bytes = 35,
                             answer_wire_bytes = 42;  // a test holds them against the packed frames

inline double serial_exchange_s(double baud) {
  return 10.0 * static_cast<double>(sample_wire_bytes + answer_wire_bytes) / baud;
}
inline double baud_wanted(double period_s) {
  return 10.0 * static_cast<double>(sample_wire_bytes + answer_wire_bytes) / period_s;
}

}  // namespace slipbench
