/*
 * From one line to a verdict and numbers; judging a line reads and changes no controller.
 *
 * The table is the one list of verbs: name, fields by kind, and who obeys. Kinds: b u8, w u16,
 * l u32, h h32, c code of a dark, a what is asked for, r row of an injection, s open or close,
 * d a dither (two numbers); upper case: the field may be absent.
 */
#include "parts.h"

#define DARK_HOST_FIRST 64u
#define DARK_HOST_LAST 254u
#define WORD_MAX 12u

struct verb {
  char name[9];
  char kinds[7];
  void (*obey)(struct core *c, const struct core_order *o);
};

static const CORE_FLASH struct verb verbs[VERBS] = {
    {"who", "b", core_obey_who},
    {"ask", "a", core_obey_ask},
    {"arm", "h", core_obey_arm},
    {"permit", "hlwwwD", core_obey_permit},
    {"dark", "c", core_obey_dark},
    {"reset", "b", core_obey_reset},
    {"stage", "b", core_obey_stage},
    {"point", "bww", core_obey_point},
    {"commit", "h", core_obey_commit},
    {"readback", "b", core_obey_readback},
    {"inject", "rh", core_obey_inject},
    {"cool", "hw", core_obey_absent},
    {"shutter", "sH", core_obey_absent},
    {"status", "", core_obey_status},
};

static const CORE_FLASH char asks[2][7] = {"arm", "inject"};
static const CORE_FLASH char moves[2][6] = {"open", "close"};
static const CORE_FLASH char rows[ROWS][13] = {"case-over",    "case-open", "case-short",
                                               "over-ceiling", "key",       "loop",
                                               "supply-low"};

/** Letter of a verb's name, 0 past its end. */
char core_verb_letter(uint8_t verb, uint8_t at) {
  return verbs[verb].name[at];
}

/** Letter of an injection row's name, 0 past its end. */
char core_row_letter(uint8_t row, uint8_t at) {
  return rows[row][at];
}

/* A stretch of the line. */
struct span {
  const uint8_t *bytes;
  uint8_t length;
};

static uint8_t equals(struct span s, const CORE_FLASH char *text) {
  uint8_t i = 0;
  for (; i < s.length; i++) {
    if (text[i] == 0 || s.bytes[i] != (uint8_t)text[i]) return 0;
  }
  return (uint8_t)(text[i] == 0);
}

/* Decimal, no leading zero, at most `max`. */
static uint8_t decimal(struct span s, uint32_t max, uint32_t *out) {
  if (s.length == 0u || s.length > 10u || (s.length > 1u && s.bytes[0] == (uint8_t)'0')) return 0;
  uint32_t value = 0;
  for (uint8_t i = 0; i < s.length; i++) {
    if (s.bytes[i] < (uint8_t)'0' || s.bytes[i] > (uint8_t)'9') return 0;
    uint8_t digit = (uint8_t)(s.bytes[i] - (uint8_t)'0');
    if (value > (0xFFFFFFFFul - digit) / 10u) return 0;
    value = value * 10u + digit;
  }
  *out = value;
  return (uint8_t)(value <= max);
}

static uint8_t hex_digit(uint8_t byte, uint8_t *out) {
  if (byte >= (uint8_t)'0' && byte <= (uint8_t)'9') {
    *out = (uint8_t)(byte - (uint8_t)'0');
  } else if (byte >= (uint8_t)'A' && byte <= (uint8_t)'F') {
    *out = (uint8_t)(byte - (uint8_t)'A' + 10);
  } else {
    return 0;
  }
  return 1;
}

static uint8_t hex(struct span s, uint8_t digits, uint32_t *out) {
  if (s.length != digits) return 0;
  uint32_t value = 0;
  for (uint8_t i = 0; i < digits; i++) {
    uint8_t digit = 0;
    if (!hex_digit(s.bytes[i], &digit)) return 0;
    value = (value << 4) | digit;
  }
  *out = value;
  return 1;
}

static uint8_t dark_code(struct span s, uint32_t *out) {
  return (uint8_t)(decimal(s, DARK_HOST_LAST, out) && (*out == 0u || *out >= DARK_HOST_FIRST));
}

static uint8_t word_byte(uint8_t byte, uint8_t first) {
  if (byte >= (uint8_t)'a' && byte <= (uint8_t)'z') return 1;
  if (first) return 0;
  return (uint8_t)((byte >= (uint8_t)'0' && byte <= (uint8_t)'9') || byte == (uint8_t)'.' ||
                   byte == (uint8_t)'-');
}

/* Any word is well formed; one that is no row of this core reads as ROWS. */
static uint8_t row(struct span s, uint32_t *out) {
  if (s.length == 0u || s.length > WORD_MAX) return 0;
  for (uint8_t i = 0; i < s.length; i++) {
    if (!word_byte(s.bytes[i], (uint8_t)(i == 0u))) return 0;
  }
  uint8_t i = 0;
  while (i < ROWS && !equals(s, rows[i])) i = (uint8_t)(i + 1u);
  *out = i;
  return 1;
}

static uint8_t dither(struct span s, struct core_order *o) {
  for (uint8_t i = 0; i < s.length; i++) {
    if (s.bytes[i] != (uint8_t)'/') continue;
    struct span amplitude = {s.bytes, i};
    struct span period = {s.bytes + i + 1u, (uint8_t)(s.length - i - 1)};
    uint32_t *arg = &o->arg[o->count];
    o->count = (uint8_t)(o->count + 2u);
    return (uint8_t)(decimal(amplitude, 0xFFFFu, arg) && decimal(period, 0xFFFFu, arg + 1));
  }
  return 0;
}

static uint8_t field(char kind, struct span s, struct core_order *o) {
  if (kind == 'd') return dither(s, o);
  uint32_t *out = &o->arg[o->count];
  o->count = (uint8_t)(o->count + 1u);
  switch (kind) {
    case 'b': return decimal(s, 0xFFu, out);
    case 'w': return decimal(s, 0xFFFFu, out);
    case 'l': return decimal(s, 0xFFFFFFFFul, out);
    case 'h': return hex(s, 8, out);
    case 'c': return dark_code(s, out);
    case 'r': return row(s, out);
    case 'a':
      *out = equals(s, asks[0]) ? OFFER_ARM : OFFER_INJECT;
      return (uint8_t)(*out == OFFER_ARM || equals(s, asks[1]));
    case 's':
      *out = equals(s, moves[0]);
      return (uint8_t)(*out || equals(s, moves[1]));
    default: return 0;
  }
}

/* The next stretch up to a space; moves *at behind that space, or to length + 1 at the end. */
static struct span cut_field(const uint8_t *line, uint8_t length, uint8_t *at) {
  uint8_t from = *at;
  uint8_t to = from;
  while (to < length && line[to] != (uint8_t)' ') to = (uint8_t)(to + 1u);
  *at = (uint8_t)(to + 1u);
  struct span s = {line + from, (uint8_t)(to - from)};
  return s;
}

/* `shutter open` wants a session, `shutter close` none. */
static uint8_t form_of_whole(const struct core_order *o) {
  return (uint8_t)(o->verb != VERB_SHUTTER || o->count == 1u + o->arg[0]);
}

static uint8_t parse_fields(const uint8_t *line, uint8_t length, uint8_t at,
                            struct core_order *o) {
  const CORE_FLASH char *kinds = verbs[o->verb].kinds;
  uint8_t i = 0;
  for (; kinds[i] != 0; i++) {
    uint8_t optional = (uint8_t)((kinds[i] & 0x20) == 0);
    if (at > length) {
      if (!optional) return 0;
      break;
    }
    if (!field((char)(kinds[i] | 0x20), cut_field(line, length, &at), o)) return 0;
  }
  return (uint8_t)(at > length && form_of_whole(o));
}

static uint8_t find_verb(struct span name, struct core_order *o) {
  for (uint8_t i = 0; i < VERBS; i++) {
    if (equals(name, verbs[i].name)) {
      o->verb = i;
      return 1;
    }
  }
  return 0;
}

static uint8_t checksum_fits(const uint8_t *line, uint8_t length) {
  uint32_t stated = 0;
  struct span digits = {line + length - 4u, 4};
  return (uint8_t)(length >= 6u && line[length - 5u] == (uint8_t)' ' && hex(digits, 4, &stated) &&
                   core_crc16(line, (uint16_t)(length - 5u)) == stated);
}

/** What a line without its line end is, one of enum core_verdict; fills `order` when good. */
uint8_t core_judge_line(const uint8_t *line, uint16_t length, struct core_order *order) {
  if (length == 0u) return LINE_EMPTY;
  if (length > CORE_LINE_MAX) return LINE_LONG;
  for (uint16_t i = 0; i < length; i++) {
    if (line[i] < 0x20u || line[i] > 0x7Eu) return LINE_CHAR;
  }
  if (line[0] != (uint8_t)'>') return LINE_DIRECTION;
  if (length < 6u || !checksum_fits(line, (uint8_t)length)) return LINE_CRC;
  uint8_t body = (uint8_t)(length - 5u);
  uint8_t at = 1;
  order->count = 0;
  if (!find_verb(cut_field(line, body, &at), order)) return LINE_VERB;
  return parse_fields(line, body, at, order) ? LINE_GOOD : LINE_FORM;
}

/** Does what a good line orders. */
void core_obey_order(struct core *c, const struct core_order *order) {
  verbs[order->verb].obey(c, order);
}
