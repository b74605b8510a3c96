/* The board's main loop: frames in, frames out, gates, watchdog. The protocol is sim/board/README.md.
 *
 * CAUTION. This is not a safety function. First trials with the power stage disconnected or the DC link current-limited, an
 * emergency stop within reach, the shaft guarded, by qualified people under local codes. */
#include <string.h>

#include "tools/firmware/control.h"
#include "tools/firmware/port.h"

static control drive;
static board_receiver receiver;
static board_answer last;
static int asked, answered;
static uint32_t silence; /* control periods without a sample that open the gates; 0: any number */

static void send(uint8_t* payload, size_t count) {
  uint8_t wire[BOARD_WIRE_MAX];
  port_write(wire, board_seal(payload, count, wire));
}

static void say_hello(uint16_t session) {
  uint8_t payload[BOARD_PAYLOAD_MAX];
  board_hello hello;
  memset(&hello, 0, sizeof hello);
  hello.version = BOARD_PROTOCOL_VERSION;
  hello.session = session;
  hello.control_period_ns = BOARD_CONTROL_PERIOD_NS;
  hello.currents = BOARD_CURRENTS;
  hello.current_bits = BOARD_CURRENT_BITS;
  hello.dc_link_bits = BOARD_DC_LINK_BITS;
  hello.estimates = BOARD_SPEED | BOARD_FLUX | BOARD_ANGLE | BOARD_TORQUE;
  hello.used_unit = port_used_unit;
  hello.duty_counts = BOARD_DUTY_COUNTS;
  hello.clock_Hz = port_clock_Hz;
  hello.current_range_A = BOARD_CURRENT_RANGE_A;
  hello.dc_link_range_V = BOARD_DC_LINK_RANGE_V;
  strncpy(hello.name, port_name, BOARD_NAME_LENGTH - 1u);
  send(payload, board_pack_hello(&hello, payload));
}

static void begin(void) {
  port_gates(0);
  control_begin(&drive);
  asked = answered = 0;
  silence = 0;
}

static void answer(const board_sample* sample) {
  uint8_t payload[BOARD_PAYLOAD_MAX];
  const int again = answered && sample->sequence == last.sequence && sample->tick == last.tick;
  if (!again) {
    port_use_begin();
    control_step(&drive, sample, &last);
    last.used = port_use_end();
    port_gates(last.gates);
    answered = 1;
  }
  send(payload, board_pack_answer(&last, payload));
}

static void take(const uint8_t* payload) {
  board_ask ask;
  board_sample sample;
  switch (payload[0]) {
    case BOARD_ASK:
      board_unpack_ask(payload, &ask);
      begin();
      asked = ask.version == BOARD_PROTOCOL_VERSION;
      silence = ask.silence;
      say_hello(ask.session);
      break;
    case BOARD_SAMPLE:
      if (!asked) break;
      board_unpack_sample(payload, &sample);
      answer(&sample);
      break;
    case BOARD_END:
      begin();
      break;
    default:
      break;
  }
}

int main(void) {
  uint8_t bytes[64], payload[BOARD_PAYLOAD_MAX];
  port_open();
  begin();
  say_hello(0);
  for (;;) {
    const int came = port_read(bytes, sizeof bytes, answered ? silence : 0u);
    int i;
    if (came < 0) break;
    if (came == 0) {
      port_gates(0);
      drive.fault = FAULT_SILENCE;
    }
    for (i = 0; i < came; ++i) {
      if (board_receive(&receiver, bytes[i], payload) > 0) take(payload);
    }
  }
  port_gates(0);
  return 0;
}
