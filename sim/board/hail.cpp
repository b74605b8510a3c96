#include "sim/board/hail.hpp"

#include <fmt/format.h>
#include <unistd.h>

#include <cmath>

#include "sim/engine/outside.hpp"
#include "sim/scenario/input_error.hpp"

namespace slipbench {

namespace {

[[noreturn]] void failed(const Link& link, const std::string& what) {
  throw OutsideError(fmt::format("board on {}: {}", link.name(), what));
}

void check_hello(const Link& link, const board_hello& h) {
  if (h.version != BOARD_PROTOCOL_VERSION) {
    failed(link,
           fmt::format(
               "it speaks version {} of the frames, this is version {}: build its firmware anew from this slipbench",
               h.version, BOARD_PROTOCOL_VERSION));
  }
  const auto bits = [](unsigned n) { return n >= 8 && n <= 16; };
  const auto range = [](float x) { return std::isfinite(x) && x > 0.0F; };
  const char* wrong = h.control_period_ns == 0                         ? "a control period of 0"
                      : h.currents != 2 && h.currents != 3             ? "currents other than 2 or 3"
                      : !bits(h.current_bits) || !bits(h.dc_link_bits) ? "a converter of other than 8 to 16 bits"
                      : !range(h.current_range_A)                      ? "a current range that is none"
                      : !range(h.dc_link_range_V)                      ? "a DC link range that is none"
                      : h.duty_counts < 100                            ? "fewer than 100 counts of duty"
                      : h.used_unit > BOARD_USED_NANOSECONDS           ? "an unknown unit of what a tick costs"
                                                                       : nullptr;
  if (wrong) failed(link, fmt::format("its hello names {}", wrong));
}

[[noreturn]] void refuse(const Scenario& s, const std::string& key, const std::string& message) {
  throw InputError(s.path, key, message, "board");
}

void fit_converter(const Scenario& s, AnalogSensorSettings& sensor, const std::string& key, const char* range_key,
                   unsigned bits, double range) {
  sensor.present = true;
  if (sensor.bits == 0) {
    sensor.bits = bits;
    sensor.range = range;
  }
  if (sensor.bits != bits)
    refuse(s, key + ".bits", fmt::format("{}.bits = {}: the board's converter has {}", key, sensor.bits, bits));
  // The board's range is single precision.
  if (std::fabs(sensor.range - range) > 1e-6 * range) {
    refuse(s, key + "." + range_key,
           fmt::format("{}.{} = {}: the board's converter ends at {}", key, range_key, sensor.range, range));
  }
}

}  // namespace

std::string name_of(const board_hello& hello) {
  const std::string all(hello.name, BOARD_NAME_LENGTH);
  std::string name = all.substr(0, all.find('\0'));
  for (char& c : name) {
    if (static_cast<unsigned char>(c) < 0x20 || c == 0x7f) c = '?';
  }
  return name;
}

board_hello hail(Link& link, std::chrono::milliseconds patience) {
  using namespace std::chrono_literals;
  const auto session = static_cast<std::uint16_t>(static_cast<unsigned>(getpid()) | 1U);
  const auto end = LinkClock::now() + patience;
  board_receiver receiver{};
  std::uint8_t payload[BOARD_PAYLOAD_MAX], wire[BOARD_WIRE_MAX];
  while (!link.closed() && LinkClock::now() < end) {
    const board_ask ask{BOARD_PROTOCOL_VERSION, session, 0};  // lock-step: the drive's time stands still
    link.send({wire, board_seal(payload, board_pack_ask(&ask, payload), wire)});
    const auto again = std::min(end, LinkClock::now() + 250ms);
    for (auto bytes = link.receive(again); !bytes.empty(); bytes = link.receive(again)) {
      for (const std::uint8_t byte : bytes) {
        if (board_receive(&receiver, byte, payload) == 0 || payload[0] != BOARD_HELLO) continue;
        board_hello hello;
        board_unpack_hello(payload, &hello);
        if (hello.version == BOARD_PROTOCOL_VERSION && hello.session != session) continue;
        check_hello(link, hello);
        return hello;
      }
    }
  }
  if (link.closed()) failed(link, link.why() + " before it said hello");
  const unsigned damaged = receiver.bad_stuffing + receiver.bad_length + receiver.bad_check;
  failed(link, fmt::format("it said no hello within {} s ({})", std::chrono::duration<double>(patience).count(),
                           damaged > 0 ? fmt::format("{} damaged frames came: is the baud rate right?", damaged)
                           : receiver.good == 0 ? "nothing came"
                                                : "other frames came"));
}

void check_drivable(const Scenario& s) {
  if (s.on_mains())
    refuse(s, "supply.kind", "board: this drive runs on the mains; a board needs supply.kind = \"inverter\"");
  if (s.run.start == "steady") {
    refuse(
        s, "run.start",
        "run.start = \"steady\": a board cannot be run in before t = 0; start from \"standstill\" or \"magnetised\"");
  }
  for (const auto& e : s.estimators) {
    if (e.name == outside_name)
      refuse(s, "estimator",
             "an estimator is called 'board', which is the name of the board's own estimates: rename it");
  }
  for (const auto& e : s.events) {
    if (e.kind == "speed_from")
      refuse(s, "event",
             "an event of kind speed_from changes the scenario's controller, which the board stands in for");
  }
}

Scenario fit(Scenario s, const board_hello& hello) {
  check_drivable(s);
  const double period_s = 1e-9 * hello.control_period_ns;
  if (std::fabs(s.run.control_period_s - period_s) > 1e-9 * period_s) {
    refuse(s, "run.control_period_s",
           fmt::format("run.control_period_s = {}: the board's control period is {} s; --set run.control_period_s={}",
                       s.run.control_period_s, period_s, period_s));
  }
  if (s.sensors.current_phases != hello.currents) {
    refuse(s, "sensors.current.phases",
           fmt::format("sensors.current.phases = {}: the board samples {} currents", s.sensors.current_phases,
                       hello.currents));
  }
  fit_converter(s, s.sensors.current, "sensors.current", "range_A", hello.current_bits,
                static_cast<double>(hello.current_range_A));
  fit_converter(s, s.sensors.dc_link, "sensors.dc_link", "range_V", hello.dc_link_bits,
                static_cast<double>(hello.dc_link_range_V));
  const auto edges = static_cast<std::int64_t>(hello.encoder_edges);
  const SpeedSensorSettings& speed = s.sensors.speed;
  if (edges > 0 && (speed.kind != "encoder" || 4 * speed.lines_per_rev != edges)) {
    refuse(s, "sensors.speed",
           fmt::format("the board counts the edges of an encoder of {} lines: sensors.speed.kind = \"encoder\", "
                       "sensors.speed.lines_per_rev = {}",
                       edges / 4, edges / 4));
  }
  return s;
}

}  // namespace slipbench
