/* The controller's own lines: words and numbers into c->line, then checksum and line end. */
#include "parts.h"

/* In the order of enum core_word. */
static const CORE_FLASH char words[][11] = {
    "boot",    "hello",     "channel",  "end",     "sample", "offer",    "yes",        "no",
    "curve",   "counts",    "power",    "brown-out", "watchdog", "external", "unknown", "state",
    "version", "session",   "old",      "stale",   "over",   "term",     "range",      "form",
    "capability", "key",    "loop",     "case",    "memory", "worn",     "curve",      "checksum",
    "order",   "wrong",     "none",     "back-off", "cause", "injected", "current",    "arm",
    "inject"};

void core_put_start(struct core *c) {
  c->line_length = 0;
}

/** Appends; one letter past the longest line is kept as a mark that it does not fit. */
void core_put_char(struct core *c, char letter) {
  if (c->line_length > CORE_LINE_MAX) return;
  c->line[c->line_length] = (uint8_t)letter;
  c->line_length = (uint8_t)(c->line_length + 1u);
}

void core_put_space(struct core *c) {
  core_put_char(c, ' ');
}

void core_put_flash(struct core *c, const CORE_FLASH char *text) {
  for (; *text != 0; text++) core_put_char(c, *text);
}

void core_put_word(struct core *c, uint8_t word) {
  for (uint8_t i = 0; words[word][i] != 0; i++) core_put_char(c, words[word][i]);
}

/** Starts a line of the controller with this verb. */
void core_put_line(struct core *c, uint8_t word) {
  core_put_start(c);
  core_put_char(c, '<');
  core_put_word(c, word);
}

/** A space and the number. 16-bit division where it will do: an 8-bit part divides slowly. */
void core_put_u32(struct core *c, uint32_t value) {
  char digits[10];
  uint8_t n = 0;
  while (value > 0xFFFFu) {
    digits[n] = (char)('0' + (char)(value % 10u));
    n = (uint8_t)(n + 1u);
    value /= 10u;
  }
  uint16_t low = (uint16_t)value;
  do {
    digits[n] = (char)('0' + (char)(low % 10u));
    n = (uint8_t)(n + 1u);
    low = (uint16_t)(low / 10u);
  } while (low > 0u);
  core_put_space(c);
  while (n > 0u) {
    n = (uint8_t)(n - 1u);
    core_put_char(c, digits[n]);
  }
}

static char hex_letter(uint8_t nibble) {
  return (char)(nibble < 10u ? '0' + nibble : 'A' + nibble - 10);
}

void core_put_i32(struct core *c, int32_t value) {
  if (value >= 0) {
    core_put_u32(c, (uint32_t)value);
    return;
  }
  uint8_t sign = (uint8_t)(c->line_length + 1u);
  core_put_char(c, ' ');
  core_put_u32(c, 0u - (uint32_t)value);
  if (c->line_length <= CORE_LINE_MAX) c->line[sign] = (uint8_t)'-';
}

static void put_hex(struct core *c, uint16_t value) {
  for (uint8_t shift = 16; shift > 0u;) {
    shift = (uint8_t)(shift - 4u);
    core_put_char(c, hex_letter((uint8_t)((value >> shift) & 15)));
  }
}

void core_put_h16(struct core *c, uint16_t value) {
  core_put_space(c);
  put_hex(c, value);
}

void core_put_h32(struct core *c, uint32_t value) {
  core_put_space(c);
  put_hex(c, (uint16_t)(value >> 16));
  put_hex(c, (uint16_t)(value & 0xFFFFu));
}

/** Closes the line and queues it; 0 when there was no room. */
uint8_t core_put_send(struct core *c) {
  uint16_t crc = core_crc16(c->line, c->line_length);
  if (c->line_length + 5u > CORE_LINE_MAX) {
    core_defect(c); /* a manifest too wide for a line: the board's table is wrong */
    return 0;
  }
  core_put_h16(c, crc);
  c->line[c->line_length] = 0x0Au;
  uint16_t whole = (uint16_t)(c->line_length + 1u);
  return (uint8_t)(c->port->send(c->port->ctx, c->line, whole) != 0u);
}

static void put_verb(struct core *c, uint8_t verb) {
  core_put_space(c);
  for (uint8_t i = 0; core_verb_letter(verb, i) != 0; i++) {
    core_put_char(c, core_verb_letter(verb, i));
  }
}

/** Starts `<yes VERB`; the caller appends and sends. */
void core_yes(struct core *c, uint8_t verb) {
  core_put_line(c, WORD_YES);
  put_verb(c, verb);
}

/** Starts `<no VERB REASON` and counts it; the caller appends and sends. */
void core_no(struct core *c, uint8_t verb, uint8_t reason) {
  c->counts.refused++;
  core_put_line(c, WORD_NO);
  put_verb(c, verb);
  core_put_space(c);
  core_put_word(c, reason);
}

/** The whole of `<no VERB REASON`. */
void core_refuse(struct core *c, uint8_t verb, uint8_t reason) {
  core_no(c, verb, reason);
  (void)core_put_send(c);
}
