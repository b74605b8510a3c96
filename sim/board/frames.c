#include "sim/board/frames.h"

#include <string.h>

enum { checks = 4 }; /* bytes */

/* ---- checks ---- */

/* Remainders of one half byte ahead of 12 zero bits. */
static const uint16_t half_byte[16] = {0x0000, 0x1021, 0x2042, 0x3063, 0x4084, 0x50a5, 0x60c6, 0x70e7,
                                       0x8108, 0x9129, 0xa14a, 0xb16b, 0xc18c, 0xd1ad, 0xe1ce, 0xf1ef};

static uint16_t crc_byte(uint16_t crc, uint8_t byte) {
  crc = (uint16_t)((unsigned)crc << 4) ^ half_byte[(crc >> 12) ^ (byte >> 4)];
  return (uint16_t)((unsigned)crc << 4) ^ half_byte[(crc >> 12) ^ (byte & 15u)];
}

uint16_t board_crc16(uint16_t crc, const uint8_t* bytes, size_t count) {
  for (size_t i = 0; i < count; ++i) crc = crc_byte(crc, bytes[i]);
  return crc;
}

uint16_t board_crc16_back(const uint8_t* bytes, size_t count) {
  uint16_t crc = 0xffffu;
  while (count > 0) crc = crc_byte(crc, bytes[--count]);
  return crc;
}

/* ---- byte stuffing ---- */

size_t board_cobs_encode(const uint8_t* bytes, size_t count, uint8_t* out) {
  size_t code_at = 0, to = 1;
  uint8_t code = 1;
  for (size_t i = 0; i < count; ++i) {
    if (bytes[i] != 0) {
      out[to++] = bytes[i];
      ++code;
    }
    if (bytes[i] == 0 || (code == 0xff && i + 1 < count)) {
      out[code_at] = code;
      code_at = to++;
      code = 1;
    }
  }
  out[code_at] = code;
  return to;
}

size_t board_cobs_decode(const uint8_t* coded, size_t count, uint8_t* out) {
  size_t from = 0, to = 0;
  if (count == 0) return SIZE_MAX;
  while (from < count) {
    const uint8_t code = coded[from++];
    if (code == 0 || (size_t)(code - 1) > count - from) return SIZE_MAX;
    for (uint8_t i = 1; i < code; ++i) {
      if (coded[from] == 0) return SIZE_MAX;
      out[to++] = coded[from++];
    }
    if (code != 0xff && from < count) out[to++] = 0;
  }
  return to;
}

/* ---- frames ---- */

static uint8_t* put16(uint8_t* at, uint16_t x) {
  at[0] = (uint8_t)(x & 0xffu), at[1] = (uint8_t)(x >> 8);
  return at + 2;
}
static uint8_t* put32(uint8_t* at, uint32_t x) {
  return put16(put16(at, (uint16_t)(x & 0xffffu)), (uint16_t)(x >> 16));
}
static uint8_t* put_float(uint8_t* at, float x) {
  uint32_t bits;
  memcpy(&bits, &x, sizeof bits);
  return put32(at, bits);
}
static uint16_t get16(const uint8_t** at) {
  const uint8_t* p = *at;
  *at = p + 2;
  return (uint16_t)(p[0] | (unsigned)p[1] << 8);
}
static uint32_t get32(const uint8_t** at) {
  const uint32_t low = get16(at);
  return low | (uint32_t)get16(at) << 16;
}
static float get_float(const uint8_t** at) {
  const uint32_t bits = get32(at);
  float x;
  memcpy(&x, &bits, sizeof x);
  return x;
}

static size_t length_of(uint8_t type) {
  switch (type) {
    case BOARD_HELLO:
      return 64;
    case BOARD_ASK:
      return 7;
    case BOARD_SAMPLE:
      return 28;
    case BOARD_ANSWER:
      return 35;
    case BOARD_END:
      return 1;
    default:
      return 0;
  }
}

size_t board_seal(uint8_t* payload, size_t count, uint8_t* wire) {
  const uint16_t ahead = board_crc16(0xffffu, payload, count), back = board_crc16_back(payload, count);
  put16(put16(payload + count, ahead), back);
  wire[0] = 0;
  const size_t coded = board_cobs_encode(payload, count + checks, wire + 1);
  wire[1 + coded] = 0;
  return coded + 2;
}

enum board_verdict board_unseal(const uint8_t* coded, size_t coded_count, uint8_t* payload, size_t* count) {
  if (coded_count > BOARD_CODED_MAX) return BOARD_BAD_LENGTH;
  const size_t whole = board_cobs_decode(coded, coded_count, payload);
  if (whole == SIZE_MAX) return BOARD_BAD_STUFFING;
  if (whole < 1 + checks || whole > BOARD_PAYLOAD_MAX) return BOARD_BAD_LENGTH;
  const size_t n = whole - checks;
  const uint8_t type = payload[0];
  const int versioned = (type == BOARD_HELLO || type == BOARD_ASK) && n >= 3;
  const int foreign = versioned && (payload[1] | (unsigned)payload[2] << 8) != BOARD_PROTOCOL_VERSION;
  if (n != length_of(type) && !foreign) return BOARD_BAD_LENGTH;
  const uint8_t* check = payload + n;
  const uint16_t ahead = get16(&check), back = get16(&check);
  if (board_crc16(0xffffu, payload, n) != ahead || board_crc16_back(payload, n) != back) return BOARD_BAD_CHECK;
  *count = n;
  return BOARD_GOOD;
}

size_t board_receive(board_receiver* r, uint8_t byte, uint8_t* payload) {
  if (byte != 0) {
    if (r->count < BOARD_CODED_MAX) {
      r->coded[r->count++] = byte;
    } else {
      r->too_long = 1;
    }
    return 0;
  }
  size_t length = 0;
  if (r->count > 0) {
    const enum board_verdict verdict =
        r->too_long ? BOARD_BAD_LENGTH : board_unseal(r->coded, r->count, payload, &length);
    switch (verdict) {
      case BOARD_GOOD:
        ++r->good;
        break;
      case BOARD_BAD_STUFFING:
        ++r->bad_stuffing;
        break;
      case BOARD_BAD_LENGTH:
        ++r->bad_length;
        break;
      case BOARD_BAD_CHECK:
        ++r->bad_check;
        break;
    }
    if (verdict != BOARD_GOOD) length = 0;
  }
  r->count = 0;
  r->too_long = 0;
  return length;
}

/* ---- the five kinds ---- */

size_t board_pack_hello(const board_hello* h, uint8_t* payload) {
  uint8_t* at = payload;
  *at++ = BOARD_HELLO;
  at = put16(at, h->version);
  at = put16(at, h->session);
  at = put32(at, h->control_period_ns);
  *at++ = h->currents;
  *at++ = h->current_bits;
  *at++ = h->dc_link_bits;
  *at++ = h->estimates;
  *at++ = h->used_unit;
  at = put16(at, h->duty_counts);
  at = put32(at, h->encoder_edges);
  at = put32(at, h->clock_Hz);
  at = put_float(at, h->current_range_A);
  at = put_float(at, h->dc_link_range_V);
  memcpy(at, h->name, BOARD_NAME_LENGTH);
  return length_of(BOARD_HELLO);
}

void board_unpack_hello(const uint8_t* payload, board_hello* h) {
  const uint8_t* at = payload + 1;
  memset(h, 0, sizeof *h);
  h->version = get16(&at);
  if (h->version != BOARD_PROTOCOL_VERSION) return;
  h->session = get16(&at);
  h->control_period_ns = get32(&at);
  h->currents = *at++;
  h->current_bits = *at++;
  h->dc_link_bits = *at++;
  h->estimates = *at++;
  h->used_unit = *at++;
  h->duty_counts = get16(&at);
  h->encoder_edges = get32(&at);
  h->clock_Hz = get32(&at);
  h->current_range_A = get_float(&at);
  h->dc_link_range_V = get_float(&at);
  memcpy(h->name, at, BOARD_NAME_LENGTH);
}

size_t board_pack_ask(const board_ask* ask, uint8_t* payload) {
  payload[0] = BOARD_ASK;
  put16(put16(put16(payload + 1, ask->version), ask->session), ask->silence);
  return length_of(BOARD_ASK);
}

void board_unpack_ask(const uint8_t* payload, board_ask* ask) {
  const uint8_t* at = payload + 1;
  ask->version = get16(&at);
  ask->session = ask->silence = 0;
  if (ask->version != BOARD_PROTOCOL_VERSION) return;
  ask->session = get16(&at);
  ask->silence = get16(&at);
}

size_t board_pack_sample(const board_sample* s, uint8_t* payload) {
  uint8_t* at = payload;
  *at++ = BOARD_SAMPLE;
  at = put16(at, s->sequence);
  at = put32(at, s->tick);
  *at++ = s->gates;
  for (int i = 0; i < 3; ++i) at = put16(at, (uint16_t)s->current[i]);
  at = put16(at, (uint16_t)s->dc_link);
  at = put32(at, s->encoder);
  at = put_float(at, s->speed_reference_rad_s);
  put_float(at, s->torque_reference_Nm);
  return length_of(BOARD_SAMPLE);
}

static int16_t signed16(uint16_t x) { return (int16_t)(x < 0x8000u ? (int)x : (int)x - 0x10000); }

void board_unpack_sample(const uint8_t* payload, board_sample* s) {
  const uint8_t* at = payload + 1;
  s->sequence = get16(&at);
  s->tick = get32(&at);
  s->gates = *at++;
  for (int i = 0; i < 3; ++i) s->current[i] = signed16(get16(&at));
  s->dc_link = signed16(get16(&at));
  s->encoder = get32(&at);
  s->speed_reference_rad_s = get_float(&at);
  s->torque_reference_Nm = get_float(&at);
}

size_t board_pack_answer(const board_answer* a, uint8_t* payload) {
  uint8_t* at = payload;
  *at++ = BOARD_ANSWER;
  at = put16(at, a->sequence);
  at = put32(at, a->tick);
  *at++ = a->gates;
  *at++ = a->fault;
  for (int i = 0; i < 3; ++i) at = put16(at, a->duty[i]);
  at = put_float(at, a->speed_rad_s);
  at = put_float(at, a->rotor_flux_Wb);
  at = put_float(at, a->rotor_flux_angle_rad);
  at = put_float(at, a->torque_Nm);
  put32(at, a->used);
  return length_of(BOARD_ANSWER);
}

void board_unpack_answer(const uint8_t* payload, board_answer* a) {
  const uint8_t* at = payload + 1;
  a->sequence = get16(&at);
  a->tick = get32(&at);
  a->gates = *at++;
  a->fault = *at++;
  for (int i = 0; i < 3; ++i) a->duty[i] = get16(&at);
  a->speed_rad_s = get_float(&at);
  a->rotor_flux_Wb = get_float(&at);
  a->rotor_flux_angle_rad = get_float(&at);
  a->torque_Nm = get_float(&at);
  a->used = get32(&at);
}

size_t board_pack_end(uint8_t* payload) {
  payload[0] = BOARD_END;
  return length_of(BOARD_END);
}
