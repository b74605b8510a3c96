// Frames of the board against the published vectors of their parts, and the page's own table of lengths.
#include <cstring>
#include <limits>
#include <numeric>

#include <catch2/catch.hpp>

#include "sim/board/budget.hpp"
#include "sim/board/frames.h"

namespace {

using Bytes = std::vector<std::uint8_t>;

std::uint16_t crc(const Bytes& b) { return board_crc16(0xffff, b.data(), b.size()); }

Bytes text(const char* t) { return {t, t + std::strlen(t)}; }

Bytes stuffed(const Bytes& in) {
  Bytes out(in.size() + in.size() / 254 + 1);
  out.resize(board_cobs_encode(in.data(), in.size(), out.data()));
  return out;
}

Bytes run_of(int first, int last) {
  Bytes b;
  for (int x = first; x <= last; ++x) b.push_back(static_cast<std::uint8_t>(x));
  return b;
}

Bytes joined(std::initializer_list<Bytes> parts) {
  Bytes all;
  for (const Bytes& p : parts) all.insert(all.end(), p.begin(), p.end());
  return all;
}

}  // namespace

// Catalogue of parametrised CRC algorithms (G. Cook), CRC-16/IBM-3740, also called CCITT-FALSE; the last two computed bit by bit.
TEST_CASE("frame check: the catalogue's value, and those of the empty text, of zeros, of a letter",
          "[sim/board][published]") {
  CHECK(crc(text("123456789")) == 0x29b1);
  CHECK(crc({}) == 0xffff);
  CHECK(crc({0, 0, 0, 0}) == 0x84c0);
  CHECK(crc(text("A")) == 0xb915);
}

TEST_CASE("frame check backwards: that of the reversed bytes", "[sim/board]") {
  const Bytes forth = text("987654321");
  CHECK(board_crc16_back(forth.data(), forth.size()) == 0x29b1);
}

// S. Cheshire, M. Baker, IEEE/ACM Trans. Networking 7(2), 1999, 159-172: the rule, and the packet of its figure (the last row); runs
// around 254 bytes by the rule.
TEST_CASE("byte stuffing: published pairs, both ways", "[sim/board][published]") {
  const std::vector<std::pair<Bytes, Bytes>> pairs = {
      {{}, {0x01}},
      {{0x00}, {0x01, 0x01}},
      {{0x00, 0x00}, {0x01, 0x01, 0x01}},
      {{0x00, 0x11, 0x00}, {0x01, 0x02, 0x11, 0x01}},
      {{0x11, 0x22, 0x00, 0x33}, {0x03, 0x11, 0x22, 0x02, 0x33}},
      {{0x11, 0x22, 0x33, 0x44}, {0x05, 0x11, 0x22, 0x33, 0x44}},
      {{0x11, 0x00, 0x00, 0x00}, {0x02, 0x11, 0x01, 0x01, 0x01}},
      {run_of(1, 254), joined({{0xff}, run_of(1, 254)})},
      {joined({{0x00}, run_of(1, 254)}), joined({{0x01, 0xff}, run_of(1, 254)})},
      {run_of(1, 255), joined({{0xff}, run_of(1, 254), {0x02, 0xff}})},
      {joined({run_of(2, 255), {0x00}}), joined({{0xff}, run_of(2, 255), {0x01, 0x01}})},
      {joined({run_of(3, 255), {0x00, 0x01}}), joined({{0xfe}, run_of(3, 255), {0x02, 0x01}})},
      {{0x45, 0x00, 0x00, 0x2c, 0x4c, 0x79, 0x00, 0x00, 0x40, 0x06, 0x4f, 0x37},
       {0x02, 0x45, 0x01, 0x04, 0x2c, 0x4c, 0x79, 0x01, 0x05, 0x40, 0x06, 0x4f, 0x37}},
  };
  for (const auto& [plain, coded] : pairs) {
    CHECK(stuffed(plain) == coded);
    Bytes back(coded.size());
    back.resize(board_cobs_decode(coded.data(), coded.size(), back.data()));
    CHECK(back == plain);
  }
}

TEST_CASE("byte stuffing: what is none is refused", "[sim/board]") {
  const std::vector<Bytes> wrong = {{},           {0x00},       {0x03, 0x11},
                                    {0x02, 0x00}, {0x01, 0x00}, {0x05, 0x11, 0x22, 0x00, 0x44}};
  for (const Bytes& coded : wrong) {
    Bytes out(coded.size() + 1);
    CHECK(board_cobs_decode(coded.data(), coded.size(), out.data()) == SIZE_MAX);
  }
}

// Written byte by byte from the table in sim/board/README.md.
TEST_CASE("frames: bytes in the order of the page, and back", "[sim/board]") {
  std::uint8_t payload[BOARD_PAYLOAD_MAX];
  board_sample s{};
  s.sequence = 0x0201, s.tick = 0x06050403, s.gates = 1;
  s.current[0] = -2, s.current[1] = 0x0807, s.current[2] = -32768, s.dc_link = 1433;
  s.encoder = 0xfffefdfc, s.speed_reference_rad_s = 1.5F, s.torque_reference_Nm = -0.0F;
  const Bytes sample = {3,    1,    2,    3,    4,    5,    6,    1,    0xfe, 0xff, 7,    8, 0, 0x80,
                        0x99, 0x05, 0xfc, 0xfd, 0xfe, 0xff, 0x00, 0x00, 0xc0, 0x3f, 0x00, 0, 0, 0x80};
  REQUIRE(board_pack_sample(&s, payload) == sample.size());
  CHECK(Bytes(payload, payload + sample.size()) == sample);
  board_sample s_back{};
  board_unpack_sample(payload, &s_back);
  CHECK((s_back.current[0] == -2 && s_back.current[2] == -32768 && s_back.encoder == s.encoder &&
         s_back.speed_reference_rad_s == 1.5F && std::signbit(s_back.torque_reference_Nm)));

  board_answer a{};
  a.sequence = 0xffff, a.tick = 1, a.gates = 1, a.fault = 9;
  a.duty[0] = 1, a.duty[1] = 0x1234, a.duty[2] = 65535;
  a.speed_rad_s = -2.0F, a.rotor_flux_Wb = 0.5F, a.rotor_flux_angle_rad = 1.0F,
  a.torque_Nm = std::numeric_limits<float>::infinity();
  a.used = 3200;
  const Bytes answer = {4,    0xff, 0xff, 1, 0,    0, 0, 1,    9,    1, 0, 0x34, 0x12, 0xff, 0xff, 0, 0, 0,
                        0xc0, 0,    0,    0, 0x3f, 0, 0, 0x80, 0x3f, 0, 0, 0x80, 0x7f, 0x80, 0x0c, 0, 0};
  REQUIRE(board_pack_answer(&a, payload) == answer.size());
  CHECK(Bytes(payload, payload + answer.size()) == answer);
  board_answer a_back{};
  board_unpack_answer(payload, &a_back);
  CHECK((a_back.duty[2] == 65535 && a_back.used == 3200 && a_back.fault == 9 && a_back.speed_rad_s == -2.0F));
}

TEST_CASE("frames: lengths on the wire are the page's", "[sim/board]") {
  std::uint8_t payload[BOARD_PAYLOAD_MAX], wire[BOARD_WIRE_MAX];
  const board_hello hello{};
  const board_ask ask{};
  const board_sample sample{};
  const board_answer answer{};
  CHECK(board_seal(payload, board_pack_hello(&hello, payload), wire) == 71);
  CHECK(board_seal(payload, board_pack_ask(&ask, payload), wire) == 14);
  CHECK(board_seal(payload, board_pack_sample(&sample, payload), wire) == slipbench::sample_wire_bytes);
  CHECK(board_seal(payload, board_pack_answer(&answer, payload), wire) == slipbench::answer_wire_bytes);
  CHECK(board_seal(payload, board_pack_end(payload), wire) == 8);
  CHECK((wire[0] == 0 && wire[7] == 0));
}

TEST_CASE("frames: a hello of another version is read as far as its version, whatever its length", "[sim/board]") {
  std::uint8_t payload[BOARD_PAYLOAD_MAX] = {BOARD_HELLO, 7, 0, 1, 2, 3}, wire[BOARD_WIRE_MAX], back[BOARD_PAYLOAD_MAX];
  const std::size_t sent = board_seal(payload, 6, wire);
  board_receiver receiver{};
  std::size_t length = 0;
  for (std::size_t i = 0; i < sent; ++i) length = std::max(length, board_receive(&receiver, wire[i], back));
  REQUIRE(length == 6);
  board_hello hello;
  board_unpack_hello(back, &hello);
  CHECK(hello.version == 7);
}

TEST_CASE("receiver: a run of bytes without an edge overruns nothing and is counted once", "[sim/board]") {
  board_receiver receiver{};
  std::uint8_t payload[BOARD_PAYLOAD_MAX];
  for (int i = 0; i < 100000; ++i) CHECK_FALSE(board_receive(&receiver, 0x55, payload));
  board_receive(&receiver, 0, payload);
  board_receive(&receiver, 0, payload);
  CHECK((receiver.bad_length == 1 && receiver.good == 0 && receiver.bad_check == 0 && receiver.bad_stuffing == 0));
}
