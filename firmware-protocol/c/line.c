/*
 * From received bytes to one line a pass.
 *
 * The interrupt only keeps bytes. A line stays in the ring until there is room to answer it, so that
 * no answer is lost; a permit and anything that begins with dark wait for nothing.
 */
#include "parts.h"

#define LF 0x0Au
#define CR 0x0Du
#define CANCEL 0x18u
#define CANCELS 3u
#define PREFIX_BYTES 7u
#define ANSWER_ROOM 130u /* the longest answer is `counts`, 9 + 9 * 11 + 6 bytes */
#define ROOM_WAIT_MS 50u

/* Cut now, decide later: the main loop finds the mark at its next pass. */
static void dark_at_once(struct core *c) {
  c->port->cut(c->port->ctx);
  c->wire.dark = 1;
}

void core_byte(struct core *c, uint8_t byte) {
  struct core_wire *w = &c->wire;
  if (byte != CANCEL) {
    w->cancels = 0;
  } else {
    w->cancels = (uint8_t)(w->cancels + 1u);
    if (w->cancels >= CANCELS) {
      w->cancels = 0;
      dark_at_once(c);
    }
  }
  uint8_t next = (uint8_t)(w->head + 1u);
  if (next == w->tail) return; /* full: the line that misses bytes fails its checksum */
  w->ring[w->head] = byte;
  w->head = next;
}

void core_break(struct core *c) {
  dark_at_once(c);
}

/* The first bytes of what waits in the ring. */
static uint8_t peek(const struct core *c, uint8_t *prefix, uint8_t length) {
  uint8_t n = 0;
  for (; n < PREFIX_BYTES && n < length; n++) prefix[n] = c->wire.ring[(uint8_t)(c->wire.tail + n)];
  return n;
}

static uint8_t same_letter(uint8_t byte, char lower) {
  return (uint8_t)((byte | 0x20u) == (uint8_t)lower && byte >= (uint8_t)'A');
}

/** 1 if the bytes begin with `dark` or `>dark`, letters of either case. */
uint8_t core_begins_dark(const uint8_t *bytes, uint8_t length) {
  uint8_t at = (uint8_t)(length > 0u && bytes[0] == (uint8_t)'>' ? 1u : 0u);
  return (uint8_t)(length - at >= 4 && same_letter(bytes[at], 'd') &&
                   same_letter(bytes[at + 1u], 'a') && same_letter(bytes[at + 2u], 'r') &&
                   same_letter(bytes[at + 3u], 'k'));
}

/* 1 if the bytes begin with `>permit`. */
static uint8_t begins_permit(const uint8_t *bytes, uint8_t length) {
  if (length < 7u || bytes[0] != (uint8_t)'>') return 0;
  for (uint8_t i = 0; i < 6u; i++) {
    if (bytes[i + 1u] != (uint8_t)core_verb_letter(VERB_PERMIT, i)) return 0;
  }
  return 1;
}

static void consume(struct core *c, uint8_t bytes) {
  c->wire.tail = (uint8_t)(c->wire.tail + bytes);
  c->scanned = 0;
}

/* Over-long: dropped up to its line end, but dark is looked for first. */
static void drop_long(struct core *c) {
  uint8_t prefix[PREFIX_BYTES];
  uint8_t n = peek(c, prefix, c->scanned);
  c->counts.too_long++;
  if (core_begins_dark(prefix, n)) core_bare_dark(c);
  c->skipping = 1;
  consume(c, c->scanned);
}

/* 1 when the ring holds a whole line of c->scanned bytes. */
static uint8_t find_line(struct core *c) {
  uint8_t head = c->wire.head;
  while ((uint8_t)(c->wire.tail + c->scanned) != head) { /* at most 255 turns */
    uint8_t byte = c->wire.ring[(uint8_t)(c->wire.tail + c->scanned)];
    if (byte == LF && !c->skipping) return 1;
    c->scanned = (uint8_t)(c->scanned + 1u);
    if (c->skipping) {
      c->skipping = (uint8_t)(byte != LF);
      consume(c, c->scanned);
    } else if (c->scanned > CORE_LINE_MAX + 1u ||
               (c->scanned == CORE_LINE_MAX + 1u && byte != CR)) {
      drop_long(c);
    }
  }
  return 0;
}

static uint8_t may_wait(struct core *c) {
  uint8_t prefix[PREFIX_BYTES];
  uint8_t n = peek(c, prefix, c->scanned);
  uint8_t tight = (uint8_t)(c->port->send(c->port->ctx, c->line, 0) < ANSWER_ROOM);
  if (!tight || core_begins_dark(prefix, n) || begins_permit(prefix, n)) return 0;
  return (uint8_t)!core_held(c, &c->waiting, 1, c->tick, ROOM_WAIT_MS);
}

/** Moves the next whole line into c->line without its line end; 0 when there is none yet. */
uint8_t core_line_take(struct core *c) {
  if (!find_line(c) || may_wait(c)) return 0;
  c->waiting.on = 0;
  uint8_t length = c->scanned;
  for (uint8_t i = 0; i < length; i++) c->line[i] = c->wire.ring[(uint8_t)(c->wire.tail + i)];
  consume(c, (uint8_t)(length + 1u));
  if (length > 0u && c->line[length - 1u] == CR) length = (uint8_t)(length - 1u);
  CORE_ASSERT(c, length <= CORE_LINE_MAX);
  c->line_length = length;
  return 1;
}

uint8_t core_line_waits(const struct core *c) {
  uint8_t head = c->wire.head;
  for (uint8_t at = c->wire.tail; at != head; at = (uint8_t)(at + 1u)) {
    if (c->wire.ring[at] == LF) return 1;
  }
  return 0;
}
