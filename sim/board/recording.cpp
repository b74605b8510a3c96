#include "sim/board/recording.hpp"

#include <cerrno>
#include <cstring>
#include <fstream>
#include <iterator>

#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

std::string sealed(std::uint8_t* payload, std::size_t length) {
  std::uint8_t wire[BOARD_WIRE_MAX];
  const std::size_t count = board_seal(payload, length, wire);
  return {reinterpret_cast<const char*>(wire), count};
}

[[noreturn]] void refuse(const std::string& path, const std::string& why) {
  throw InputError(path, "--link", why, "recording");
}

}  // namespace

std::string recorded(const board_hello& hello) {
  std::uint8_t payload[BOARD_PAYLOAD_MAX];
  return sealed(payload, board_pack_hello(&hello, payload));
}
std::string recorded(const board_answer& answer) {
  std::uint8_t payload[BOARD_PAYLOAD_MAX];
  return sealed(payload, board_pack_answer(&answer, payload));
}

Recording::Recording(const std::string& path) {
  std::ifstream file(path, std::ios::binary);
  if (!file) refuse(path, std::string("cannot be opened: ") + std::strerror(errno));
  const std::string bytes{std::istreambuf_iterator<char>(file), {}};
  board_receiver receiver{};
  std::uint8_t payload[BOARD_PAYLOAD_MAX];
  for (const char byte : bytes) {
    if (board_receive(&receiver, static_cast<std::uint8_t>(byte), payload) == 0) continue;
    if (receiver.good == 1 && payload[0] == BOARD_HELLO) {
      board_unpack_hello(payload, &hello_);
    } else if (receiver.good > 1 && payload[0] == BOARD_ANSWER) {
      board_unpack_answer(payload, &answers_.emplace_back());
      const std::size_t n = answers_.size();
      if (n > 1 && answers_[n - 1].tick <= answers_[n - 2].tick) refuse(path, "its answers are not in order of ticks");
    } else {
      refuse(path, "this is no recording of a board (`slipbench board ... --record FILE.frames` makes one)");
    }
  }
  if (receiver.bad_check + receiver.bad_length + receiver.bad_stuffing > 0 || receiver.count > 0)
    refuse(path, receiver.good == 0 ? "this is no recording of a board" : "the recording is damaged or cut short");
  if (receiver.good == 0) refuse(path, "the recording is empty");
  if (hello_.version != BOARD_PROTOCOL_VERSION)
    refuse(path, "recorded from version " + std::to_string(hello_.version) + " of the frames");
}

bool Recording::step(board_sample& sample, board_answer& answer) {
  sample.sequence = static_cast<std::uint16_t>(figures_.samples++);
  while (next_ < answers_.size() && answers_[next_].tick < sample.tick) ++next_;
  if (next_ == answers_.size() || answers_[next_].tick != sample.tick) {
    ++figures_.missing;
    return false;
  }
  answer = answers_[next_];
  ++figures_.answers;
  return true;
}

}  // namespace slipbench
