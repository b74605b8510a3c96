/* Frames between slipbench and a controller board, protocol version 1; sim/board/README.md is the standard, this its C99.
 *
 *   payload   type, fields (little-endian), two checks of 16 bits
 *   wire      00, COBS(payload), 00
 *
 * COBS: S. Cheshire, M. Baker, "Consistent overhead byte stuffing", IEEE/ACM Trans. Networking 7(2), 1999, 159-172.
 * CRC-16/CCITT-FALSE: x^16 + x^12 + x^5 + 1, from FFFF, not reflected; once over the bytes first to last, once over the same
 * bytes last to first. Pure functions, no allocation, no library but memcpy; firmware and host compile this one source. */
#ifndef SLIPBENCH_BOARD_FRAMES_H
#define SLIPBENCH_BOARD_FRAMES_H

#include <stddef.h>
#include <stdint.h>

#ifdef __cplusplus
extern "C" {
#endif

#define BOARD_PROTOCOL_VERSION 1u
#define BOARD_PAYLOAD_MAX 96u                    /* of any frame of this version, checks included */
#define BOARD_CODED_MAX (BOARD_PAYLOAD_MAX + 1u) /* under 254 bytes COBS adds one */
#define BOARD_WIRE_MAX (BOARD_CODED_MAX + 2u)    /* and a 00 on either side */
#define BOARD_NAME_LENGTH 32u

enum board_frame_type { BOARD_HELLO = 1, BOARD_ASK = 2, BOARD_SAMPLE = 3, BOARD_ANSWER = 4, BOARD_END = 5 };

enum board_estimates { BOARD_SPEED = 1, BOARD_FLUX = 2, BOARD_ANGLE = 4, BOARD_TORQUE = 8 };
enum board_used_unit { BOARD_USED_NOTHING = 0, BOARD_USED_INSTRUCTIONS = 1, BOARD_USED_NANOSECONDS = 2 };

/* board -> host: what it is. Unasked when it starts (session 0), then once for each ask, with that session. */
typedef struct board_hello {
  uint16_t version;
  uint16_t session;
  uint32_t control_period_ns;
  uint8_t currents;                       /* phase currents sampled: 2 (a, b) or 3 */
  uint8_t current_bits, dc_link_bits;     /* of its signed converters: code = floor(x 2^(bits-1) / range + 1/2) */
  uint8_t estimates;                      /* board_estimates that its answers hold */
  uint8_t used_unit;                      /* what `used` counts */
  uint16_t duty_counts;                   /* duty code of an upper switch that is closed throughout */
  uint32_t encoder_edges;                 /* of the encoder it counts, a turn; 0: it wants none */
  uint32_t clock_Hz;                      /* of its processor; 0: unknown */
  float current_range_A, dc_link_range_V; /* full scale */
  char name[BOARD_NAME_LENGTH];           /* UTF-8, filled up with 00 */
} board_hello;

/* host -> board: say hello and begin anew, as at power-up. */
typedef struct board_ask {
  uint16_t version;
  uint16_t session; /* not 0 */
  uint16_t
      silence; /* control periods of its own clock without a sample that open its gates; 0: it may be kept waiting */
} board_ask;

/* host -> board: what the drive shows at a control tick. */
typedef struct board_sample {
  uint16_t sequence;           /* one up with each sample, from 0 */
  uint32_t tick;               /* control periods from the start of the run */
  uint8_t gates;               /* 1: the inverter's gates are enabled now */
  int16_t current[3];          /* codes; the third is 0 where two are sampled */
  int16_t dc_link;             /* code */
  uint32_t encoder;            /* edges counted, modulo 2^32 */
  float speed_reference_rad_s; /* mechanical */
  float torque_reference_Nm;
} board_sample;

/* board -> host: what it makes of it; sequence and tick are those of the sample. */
typedef struct board_answer {
  uint16_t sequence;
  uint32_t tick;
  uint8_t gates;              /* 1: enable the gates; 0: open them at once */
  uint8_t fault;              /* 0: none; else the board's own code */
  uint16_t duty[3];           /* of duty_counts; they act delay_periods later */
  float speed_rad_s;          /* mechanical, at this tick */
  float rotor_flux_Wb;        /* peak linkage */
  float rotor_flux_angle_rad; /* electrical */
  float torque_Nm;
  uint32_t used; /* on this tick, frame handling left out */
} board_answer;

enum board_verdict {
  BOARD_GOOD = 0,
  BOARD_BAD_STUFFING, /* no COBS */
  BOARD_BAD_LENGTH,   /* shorter than a type and the checks, or not the length of its type */
  BOARD_BAD_CHECK     /* one of the two checks is wrong */
};

uint16_t board_crc16(uint16_t crc, const uint8_t* bytes, size_t count); /* go on from `crc`; begin with FFFF */
uint16_t board_crc16_back(const uint8_t* bytes, size_t count);          /* last byte first, from FFFF */

/* `out` has room for count + count / 254 + 1. Returns the coded length, without a delimiter. */
size_t board_cobs_encode(const uint8_t* bytes, size_t count, uint8_t* out);
/* `out` has room for `count`. Returns the length, or SIZE_MAX where this is no COBS. */
size_t board_cobs_decode(const uint8_t* coded, size_t count, uint8_t* out);

/* A payload of `count` bytes, without checks but with room for four more, into `wire` (BOARD_WIRE_MAX). Returns bytes to send. */
size_t board_seal(uint8_t* payload, size_t count, uint8_t* wire);
/* What stood between two 00 into `payload` (BOARD_PAYLOAD_MAX); *count without the checks. The length must be that of the
 * type where the type is one of ours, but for a hello or an ask of another version. */
enum board_verdict board_unseal(const uint8_t* coded, size_t coded_count, uint8_t* payload, size_t* count);

/* Payload without checks; the length is returned. BOARD_PAYLOAD_MAX is room enough. */
size_t board_pack_hello(const board_hello* hello, uint8_t* payload);
size_t board_pack_ask(const board_ask* ask, uint8_t* payload);
size_t board_pack_sample(const board_sample* sample, uint8_t* payload);
size_t board_pack_answer(const board_answer* answer, uint8_t* payload);
size_t board_pack_end(uint8_t* payload);
/* Of a payload whose first byte is that type and whose verdict was good. Of another version's hello only `version` is filled. */
void board_unpack_hello(const uint8_t* payload, board_hello* hello);
void board_unpack_ask(const uint8_t* payload, board_ask* ask);
void board_unpack_sample(const uint8_t* payload, board_sample* sample);
void board_unpack_answer(const uint8_t* payload, board_answer* answer);

/* Bytes as they come, cut into frames. All zero is the start. */
typedef struct board_receiver {
  uint8_t coded[BOARD_CODED_MAX];
  size_t count;
  uint8_t too_long;                                   /* more came between two 00 than any frame has */
  uint32_t good, bad_stuffing, bad_length, bad_check; /* frames, counted; empty ones are none */
} board_receiver;
/* One more byte. Returns the payload's length when it completes a good frame, else 0. */
size_t board_receive(board_receiver* receiver, uint8_t byte, uint8_t* payload);

#ifdef __cplusplus
}
#endif
#endif
