// Answers over a line that damages, drops or doubles one byte in a hundred: none wrongly accepted, all counted.
//
// Expected wrong acceptances by the checks alone: the frames that keep their length with more than 16 bits wrong, each with 2^-31 (the two checks
// have rank 31); with `ahead` alone, 2^-16. The first must be none; the second is shown to be why there are two.
#include <cstring>
#include <random>

#include <catch2/catch.hpp>

#include "sim/board/frames.h"

namespace {

struct Trial {
  std::uint64_t sent = 0, right = 0, wrong = 0, out_of_turn = 0, chunks = 0;
  std::uint64_t right_length = 0;    // frames of the right length whose content is not what was sent,
  std::uint64_t one_check_only = 0;  // and those of them that `ahead` lets pass
  board_receiver receiver{};
};

board_answer answer_at(std::uint32_t tick, std::mt19937_64& random) {
  board_answer a{};
  a.sequence = static_cast<std::uint16_t>(tick);
  a.tick = tick;
  a.gates = 1;
  for (auto& d : a.duty) d = static_cast<std::uint16_t>(random());
  for (float* x : {&a.speed_rad_s, &a.rotor_flux_Wb, &a.rotor_flux_angle_rad, &a.torque_Nm})
    *x = static_cast<float>(random() % 100000) * 0.01F;
  a.used = static_cast<std::uint32_t>(random() % 5000);
  return a;
}

// A frame of the right length and type, its content neither this tick's nor the one's before.
void count_changed(Trial& t, const std::vector<std::uint8_t>& chunk, const std::uint8_t* now,
                   const std::uint8_t* before) {
  std::uint8_t payload[BOARD_PAYLOAD_MAX];
  if (chunk.size() != 40 || board_cobs_decode(chunk.data(), chunk.size(), payload) != 39) return;
  if (payload[0] != BOARD_ANSWER || std::memcmp(payload, now, 35) == 0 || std::memcmp(payload, before, 35) == 0) return;
  ++t.right_length;
  if (board_crc16(0xffff, payload, 35) == (payload[35] | payload[36] << 8)) ++t.one_check_only;
}

Trial run(std::uint32_t frames, std::uint64_t seed) {
  Trial t;
  std::mt19937_64 random(seed);
  std::vector<std::uint8_t> chunk;
  std::uint8_t before[BOARD_PAYLOAD_MAX] = {};
  for (std::uint32_t tick = 0; tick < frames; ++tick) {
    const board_answer a = answer_at(tick, random);
    std::uint8_t whole[BOARD_PAYLOAD_MAX], payload[BOARD_PAYLOAD_MAX], wire[BOARD_WIRE_MAX];
    const std::size_t n = board_seal(whole, board_pack_answer(&a, whole), wire);
    ++t.sent;
    bool accepted = false;
    const auto arrive = [&](std::uint8_t byte) {
      if (byte != 0) chunk.push_back(byte);
      if (byte == 0 && !chunk.empty()) ++t.chunks;
      if (byte == 0) count_changed(t, chunk, whole, before);
      const std::size_t length = board_receive(&t.receiver, byte, payload);
      const bool same = length == 35 && std::memcmp(payload, whole, 35) == 0;
      if (byte == 0) chunk.clear();
      if (length == 0) return;
      board_answer b{};
      if (payload[0] == BOARD_ANSWER) board_unpack_answer(payload, &b);
      if (payload[0] != BOARD_ANSWER || accepted || b.sequence != a.sequence || b.tick != a.tick) {
        ++t.out_of_turn;
        return;
      }
      accepted = true;
      ++(same ? t.right : t.wrong);
    };
    for (std::size_t i = 0; i < n; ++i) {
      const std::uint64_t dice = random();
      if (dice % 100 != 0) {
        arrive(wire[i]);
        continue;
      }
      switch ((dice >> 32) % 3) {
        case 0:  // damaged: any other byte
          arrive(static_cast<std::uint8_t>(wire[i] ^ (1 + (dice >> 40) % 255)));
          break;
        case 1:  // dropped
          break;
        default:
          arrive(wire[i]);
          arrive(wire[i]);
      }
    }
    std::memcpy(before, whole, sizeof before);
  }
  return t;
}

void check(const Trial& t) {
  const board_receiver& r = t.receiver;
  INFO("sent " << t.sent << ", right " << t.right << ", stuffing " << r.bad_stuffing << ", length " << r.bad_length
               << ", check " << r.bad_check << ", out of turn " << t.out_of_turn << ", of the right length and wrong "
               << t.right_length << ", past one check " << t.one_check_only);
  CHECK(t.wrong == 0);
  // A frame arrives whole where its 40 inner bytes and its two edges do, 0.99^42 = 65.6 %; an edge doubled is harmless, one that is
  // dropped or turned into a byte before or after an intact neighbour likewise: between 65 and 68 % (deviation 0.05 % at 1e6, 0.15 % at 1e5).
  CHECK(static_cast<double>(t.right) > 0.65 * static_cast<double>(t.sent));
  CHECK(static_cast<double>(t.right) < 0.68 * static_cast<double>(t.sent));
  // All counted: whatever stood between two edges was good or has its reason.
  CHECK(t.chunks == std::uint64_t{r.good} + r.bad_stuffing + r.bad_length + r.bad_check);
  CHECK(r.good == t.right + t.wrong + t.out_of_turn);
}

}  // namespace

TEST_CASE("frames, 1 % of bytes damaged, dropped or doubled: none of 1e5 wrongly accepted, all counted",
          "[sim/board]") {
  check(run(100000, 1));
}

TEST_CASE("frames, 1 % of bytes damaged, dropped or doubled: none of 1e6 wrongly accepted, all counted",
          "[sim/board][long]") {
  std::uint64_t past_one_check = 0;
  for (std::uint64_t seed = 2; seed <= 6; ++seed) {
    const Trial t = run(1000000, seed);
    check(t);
    past_one_check += t.one_check_only;
  }
  CHECK(past_one_check > 0);  // why there are two: by chance about one in 5e6, and these seeds hold one
}

// The random errors above are rarely long: here every frame of the right length is noise behind its type. Of 2^22 such, 64 +- 8 pass `ahead`
// alone; both let none through but by a chance of 2^22 / 2^31 = 0.2 %, and this seed is not that one.
TEST_CASE("frames of noise: one check lets 1 in 65,536 pass, the two none", "[sim/board][long]") {
  std::mt19937_64 random(7);
  std::uint64_t one = 0, both = 0;
  std::uint8_t p[39] = {BOARD_ANSWER};
  for (int n = 0; n < 1 << 22; ++n) {
    for (std::size_t i = 1; i < sizeof p; ++i) p[i] = static_cast<std::uint8_t>(random() >> 32);
    const bool ahead = board_crc16(0xffff, p, 35) == (p[35] | p[36] << 8);
    const bool back = board_crc16_back(p, 35) == (p[37] | p[38] << 8);
    one += ahead ? 1 : 0;
    both += ahead && back ? 1 : 0;
  }
  CHECK(both == 0);
  CHECK(one > 64 - 5 * 8);  // five deviations
  CHECK(one < 64 + 5 * 8);
}
