// The exchange with a board that is no process but the other end of a socket pair: what it takes, what it counts.
#include <sys/socket.h>
#include <unistd.h>

#include <catch2/catch.hpp>
#include <cmath>

#include "sim/board/hail.hpp"
#include "sim/board/in_loop.hpp"
#include "sim/scenario/input_error.hpp"

using namespace slipbench;
using namespace std::chrono_literals;

namespace {

board_hello hello() {
  board_hello h{};
  h.version = BOARD_PROTOCOL_VERSION;
  h.control_period_ns = 100000;
  h.currents = 3, h.current_bits = 12, h.dc_link_bits = 10;
  h.estimates = BOARD_SPEED | BOARD_TORQUE;
  h.duty_counts = 1000;
  h.current_range_A = 20.0F, h.dc_link_range_V = 800.0F;
  return h;
}

// Answers are put into the line beforehand: nothing runs beside the test.
struct Line {
  int ends[2];
  Link link;
  Line() : Line(pair()) {}
  ~Line() { close(ends[1]); }
  void put(const std::vector<std::uint8_t>& bytes) const {
    REQUIRE(write(ends[1], bytes.data(), bytes.size()) == static_cast<ssize_t>(bytes.size()));
  }
  // What the host has sent, whole frames.
  [[nodiscard]] std::vector<board_sample> samples() const {
    std::vector<board_sample> all;
    std::uint8_t bytes[4096], payload[BOARD_PAYLOAD_MAX];
    const ssize_t n = recv(ends[1], bytes, sizeof bytes, MSG_DONTWAIT);
    board_receiver receiver{};
    for (ssize_t i = 0; i < n; ++i) {
      if (board_receive(&receiver, bytes[i], payload) == 0 || payload[0] != BOARD_SAMPLE) continue;
      board_unpack_sample(payload, &all.emplace_back());
    }
    return all;
  }

 private:
  static std::array<int, 2> pair() {
    std::array<int, 2> both{};
    socketpair(AF_UNIX, SOCK_STREAM, 0, both.data());
    return both;
  }
  explicit Line(std::array<int, 2> both) : ends{both[0], both[1]}, link(both[0], both[0], 0, "test") {}
};

board_answer answer(std::uint16_t sequence, std::uint32_t tick) {
  board_answer a{};
  a.sequence = sequence, a.tick = tick, a.gates = 1;
  a.duty[0] = 250, a.duty[1] = 500, a.duty[2] = 1000;
  a.speed_rad_s = 12.5F, a.rotor_flux_Wb = 7.0F, a.torque_Nm = -3.0F;
  return a;
}

std::vector<std::uint8_t> wire_of(const board_answer& a) {
  std::uint8_t payload[BOARD_PAYLOAD_MAX], wire[BOARD_WIRE_MAX];
  const std::size_t n = board_seal(payload, board_pack_answer(&a, payload), wire);
  return {wire, wire + n};
}

std::vector<std::uint8_t> spoilt(std::vector<std::uint8_t> wire) {
  wire[10] = static_cast<std::uint8_t>(wire[10] == 0x31 ? 0x32 : 0x31);
  return wire;
}

OutsideView view(std::int64_t tick, const std::vector<double>& readings) {
  OutsideView v;
  v.tick = tick;
  v.readings = readings;
  v.speed_reference_rad_s = 100.0;
  return v;
}

const std::vector<double> readings = {20.0 / 2048.0 * 5, -20.0, 20.0 / 2048.0 * -7, 800.0 / 512.0 * 300};

}  // namespace

TEST_CASE("board in the loop: readings arrive as the converters' codes, duties and estimates come back",
          "[sim/board]") {
  Line line;
  line.put(wire_of(answer(0, 0)));
  Exchange exchange(line.link, hello(), 1s, 1s);
  BoardInLoop board(exchange, hello(), 100e-6, 3);
  const OutsideAct act = board.step(view(0, readings));
  const auto sent = line.samples();
  REQUIRE(sent.size() == 1);
  CHECK((sent[0].current[0] == 5 && sent[0].current[1] == -2048 && sent[0].current[2] == -7 && sent[0].dc_link == 300));
  CHECK((sent[0].sequence == 0 && sent[0].tick == 0 && sent[0].gates == 0 && sent[0].encoder == 0));
  CHECK(sent[0].speed_reference_rad_s == 100.0F);
  CHECK((act.gates && act.clipped && act.duty.a == 0.25 && act.duty.b == 0.5 && act.duty.c == 1.0));
  CHECK((act.estimate.speed == 12.5 && act.estimate.torque == -3.0));
  CHECK(std::isnan(act.estimate.rotor_flux));  // the hello says that it is not estimated
}

TEST_CASE("board in the loop: missing answers hold what stood, and the watchdog opens the gates for good",
          "[sim/board]") {
  Line line;
  line.put(wire_of(answer(0, 0)));
  Exchange exchange(line.link, hello(), 10ms, 10ms);
  BoardInLoop board(exchange, hello(), 100e-6, 3);
  board.step(view(0, readings));
  for (int k = 1; k <= 2; ++k) {
    const OutsideAct held = board.step(view(k, readings));
    CHECK((held.gates && held.duty.a == 0.25 && held.estimate.speed == 12.5));
  }
  const OutsideAct open = board.step(view(3, readings));
  CHECK((!open.gates && std::isnan(open.estimate.speed)));
  line.put(wire_of(answer(4, 4)));  // too late to be believed again
  CHECK_FALSE(board.step(view(4, readings)).gates);
  CHECK((board.outcome().lost && !board.outcome().gone && board.outcome().opened_tick == 3));
  REQUIRE(board.events().size() == 1);
  CHECK(board.events()[0].tick == 3);
  CHECK(board.events()[0].what == "no answer from the board for 3 ticks: gates opened, the drive coasts");
}

TEST_CASE("board in the loop: two missing, one there, two missing do not add up", "[sim/board]") {
  Line line;
  Exchange exchange(line.link, hello(), 10ms, 10ms);
  BoardInLoop board(exchange, hello(), 100e-6, 3);
  for (const std::uint16_t k : {0, 3, 6}) line.put(wire_of(answer(k, k)));
  // The answers to 3 and 6 come before their samples: they are not taken for those of 1 and 2, and not kept for later.
  board.step(view(0, readings));
  for (int k = 1; k <= 2; ++k) board.step(view(k, readings));
  line.put(wire_of(answer(3, 3)));
  CHECK(board.step(view(3, readings)).gates);
  for (int k = 4; k <= 5; ++k) CHECK(board.step(view(k, readings)).gates);
  CHECK_FALSE(board.outcome().lost);
  CHECK(exchange.figures().strange == 2);
  CHECK(exchange.figures().missing == 4);
}

TEST_CASE("exchange: late, doubled, damaged, stray answers are counted, each as what it is", "[sim/board]") {
  Line line;
  Exchange exchange(line.link, hello(), 10ms, 10ms);
  board_sample sample{};
  board_answer got{};
  const auto step = [&](std::uint32_t tick) {
    sample.tick = tick;
    return exchange.step(sample, got);
  };
  CHECK_FALSE(step(0));  // missing
  line.put(wire_of(answer(0, 0)));
  line.put(wire_of(answer(1, 1)));
  line.put(wire_of(answer(1, 1)));
  CHECK(step(1));  // behind a late one, and there twice
  line.put(spoilt(wire_of(answer(2, 2))));
  CHECK_FALSE(step(2));
  board_answer beyond = answer(3, 3);
  beyond.duty[1] = 1001;
  line.put(wire_of(beyond));
  CHECK_FALSE(step(3));
  line.put(wire_of(answer(4, 5)));  // another tick
  line.put(wire_of(answer(9, 4)));  // another sequence, of no sample yet
  CHECK_FALSE(step(4));
  line.put(wire_of(answer(5, 5)));
  CHECK(step(5));
  const ExchangeFigures f = exchange.figures();
  CHECK((f.samples == 6 && f.answers == 2 && f.missing == 4));
  CHECK((f.late == 1 && f.doubled == 1 && f.damaged == 2 && f.strange == 2));
  CHECK(f.samples == f.answers + f.missing);
}

TEST_CASE("exchange: sequence goes round after 65,536 samples", "[sim/board]") {
  Line line;
  Exchange exchange(line.link, hello(), 1s, 1s);
  board_sample sample{};
  board_answer got{};
  std::uint32_t answered = 0;
  for (std::uint32_t k = 0; k < 65600; ++k) {
    line.put(wire_of(answer(static_cast<std::uint16_t>(k), k)));
    sample.tick = k;
    answered += exchange.step(sample, got) && got.tick == k ? 1 : 0;
    if (k % 64 == 0) static_cast<void>(line.samples());
  }
  CHECK(answered == 65600);
  CHECK(exchange.figures().missing + exchange.figures().doubled + exchange.figures().strange == 0);
}

TEST_CASE("scenario and board: ideal converters become the board's, others must be", "[sim/board]") {
  Scenario s;
  s.path = "x.toml";
  s.supply.kind = "inverter";
  s.run.control_period_s = 100e-6;
  const Scenario fitted = fit(s, hello());
  CHECK((fitted.sensors.current.bits == 12 && fitted.sensors.current.range == 20.0));
  CHECK((fitted.sensors.dc_link.present && fitted.sensors.dc_link.bits == 10 && fitted.sensors.dc_link.range == 800.0));
  const auto refused = [](const Scenario& with, const board_hello& h) {
    try {
      fit(with, h);
    } catch (const InputError& e) {
      return e.key();
    }
    return std::string("nothing");
  };
  Scenario other = s;
  other.sensors.current.bits = 14;
  CHECK(refused(other, hello()) == "sensors.current.bits");
  other = s, other.sensors.dc_link.bits = 10, other.sensors.dc_link.range = 700.0;
  CHECK(refused(other, hello()) == "sensors.dc_link.range_V");
  other = s, other.run.control_period_s = 50e-6;
  CHECK(refused(other, hello()) == "run.control_period_s");
  other = s, other.sensors.current_phases = 2;
  CHECK(refused(other, hello()) == "sensors.current.phases");
  other = s, other.supply.kind = "mains";
  CHECK(refused(other, hello()) == "supply.kind");
  other = s, other.run.start = "steady";
  CHECK(refused(other, hello()) == "run.start");
  other = s, other.estimators.emplace_back().name = "board";
  CHECK(refused(other, hello()) == "estimator");
  board_hello counts = hello();
  counts.encoder_edges = 4096;
  CHECK(refused(s, counts) == "sensors.speed");
  other = s, other.sensors.speed.kind = "encoder", other.sensors.speed.lines_per_rev = 1024;
  CHECK(refused(other, counts) == "nothing");
}
