/*
 * Non-volatile memory: the latch twice over, the lit mark, and the boot counter in 16 checked slots.
 *
 * Memory follows the wanted picture one byte at a time, lowest address first, never waiting. That
 * order makes a cut at any byte safe: a latch is written A then B and cleared A then B, so one of
 * the two always says latched until both say clear; the lit mark is whole-clear or it is lit.
 * Anything else than a clean "clear" is read as tripped. Memory never written (all 0xFF, counter and
 * all) is clear.
 *
 *   0..2 latch A (mark, cause, check)   3..5 latch B   6..7 lit mark
 *   16..111 slots of six bytes: counter, lowest byte first, and a CRC-16 over it and the slot
 */
#include "parts.h"

#define IMAGE_BYTES 8u
#define RECORD_BYTES 3u
#define LIT_AT 6u
#define SLOTS_AT 16u
#define SLOTS 16u
#define SLOT_BYTES 6u
#define NO_SLOT 255u
#define ERASED 0xFF
#define MARK_LATCHED 0xA5u
#define MARK_CLEAR 0x3Cu
#define TRIES_MAX 32u   /* bytes written for one picture before memory counts as failed */
#define BUSY_MAX 60000u /* reads at start while a write of before the reset ends */

static uint8_t check_byte(uint8_t mark, uint8_t cause) {
  uint16_t crc = core_crc16_add(core_crc16_add(CORE_CRC16_START, mark), cause);
  return (uint8_t)(crc & 0xFFu);
}

/* What byte `i` of the picture should be. */
static uint8_t wanted(const struct core *c, uint8_t i) {
  uint8_t latched = (uint8_t)(c->state == CORE_TRIPPED);
  uint8_t mark = latched ? MARK_LATCHED : MARK_CLEAR;
  uint8_t cause = latched ? c->cause : 0u;
  if (i >= LIT_AT) return (uint8_t)((c->lit_mark ? MARK_LATCHED : MARK_CLEAR) ^ (i == LIT_AT ? 0u : 0xFFu));
  uint8_t part = (uint8_t)(i % RECORD_BYTES);
  return part == 0u ? mark : part == 1u ? cause : check_byte(mark, cause);
}

static uint32_t next_boot(const struct core *c) {
  return c->boot + 1u;
}

static uint8_t next_slot(const struct core *c) {
  return (uint8_t)(c->slot == NO_SLOT ? 0u : (c->slot + 1u) % SLOTS);
}

static uint16_t slot_crc(uint32_t value, uint8_t slot) {
  uint16_t crc = CORE_CRC16_START;
  for (uint8_t i = 0; i < 4u; i++) crc = core_crc16_add(crc, (uint8_t)(value >> (8u * i)));
  return core_crc16_add(crc, slot);
}

static uint8_t slot_byte(uint32_t value, uint8_t slot, uint8_t i) {
  if (i < 4u) return (uint8_t)(value >> (8u * i));
  return (uint8_t)(slot_crc(value, slot) >> (i == 4u ? 0u : 8u));
}

static int16_t read_at_start(const struct core *c, uint16_t address) {
  int16_t byte = -1;
  for (uint16_t i = 0; i < BUSY_MAX && byte == -1; i++) {
    byte = c->port->nv_read(c->port->ctx, address);
  }
  return byte;
}

/* Reads `length` bytes; 0 if memory cannot be read. Notes whether all are erased. */
static uint8_t read_bytes(const struct core *c, uint16_t address, uint8_t length, uint8_t *out,
                          uint8_t *erased) {
  *erased = 1;
  for (uint8_t i = 0; i < length; i++) {
    int16_t byte = read_at_start(c, (uint16_t)(address + i));
    if (byte < 0 || byte > 0xFF) return 0;
    out[i] = (uint8_t)byte;
    if (byte != ERASED) *erased = 0;
  }
  return 1;
}

static uint8_t record_mark(const uint8_t *record) {
  if (check_byte(record[0], record[1]) != record[2]) return 0;
  return record[0] == MARK_LATCHED || record[0] == MARK_CLEAR ? record[0] : 0u;
}

static uint8_t cause_of_reset(uint8_t reset_kind) {
  if (reset_kind == CORE_WATCHDOG) return CORE_CAUSE_WATCHDOG;
  return reset_kind == CORE_BROWN_OUT ? CORE_CAUSE_BROWN_OUT : CORE_CAUSE_POWER_LOST;
}

static void start_tripped(struct core *c, uint8_t cause) {
  c->state = CORE_TRIPPED;
  c->cause = cause;
  c->latch_dirty = 1;
}

static void read_latch(struct core *c, const uint8_t *image, uint8_t reset_kind) {
  uint8_t a = record_mark(image), b = record_mark(image + RECORD_BYTES);
  uint8_t dark = (uint8_t)(image[LIT_AT] == MARK_CLEAR && image[LIT_AT + 1u] == (MARK_CLEAR ^ 0xFFu));
  if (a == MARK_LATCHED) {
    start_tripped(c, image[1]);
  } else if (b == MARK_LATCHED) {
    start_tripped(c, image[RECORD_BYTES + 1u]);
  } else if (!dark) {
    start_tripped(c, cause_of_reset(reset_kind));
  } else if (a != MARK_CLEAR || b != MARK_CLEAR) {
    start_tripped(c, CORE_CAUSE_UNKNOWN);
  }
}

/* The newest whole slot. A board whose very first slot was cut starts over there. */
static uint8_t read_slots(struct core *c) {
  uint8_t bytes[SLOT_BYTES], erased = 0, used = 0;
  c->slot = NO_SLOT;
  for (uint8_t slot = 0; slot < SLOTS; slot++) {
    uint16_t at = (uint16_t)(SLOTS_AT + (uint16_t)slot * SLOT_BYTES);
    if (!read_bytes(c, at, SLOT_BYTES, bytes, &erased)) return 0;
    if (erased) continue;
    used = (uint8_t)(used + 1u);
    uint32_t value = 0;
    for (uint8_t i = 4; i > 0u; i--) value = (value << 8) | bytes[i - 1u];
    uint16_t crc = (uint16_t)(bytes[4] | (uint16_t)((uint16_t)bytes[5] << 8));
    if (crc != slot_crc(value, slot)) {
      if (slot == 0u) used = (uint8_t)(used - 1u);
      continue;
    }
    if (c->slot == NO_SLOT || value > c->boot) {
      c->boot = value;
      c->slot = slot;
    }
  }
  return (uint8_t)(c->slot != NO_SLOT || used == 0u);
}

/** Reads what the last boot left: latch, lit mark, boot counter. */
void core_memory_start(struct core *c, uint8_t reset_kind) {
  uint8_t image[IMAGE_BYTES], erased = 0;
  c->memory = read_bytes(c, 0, IMAGE_BYTES, image, &erased);
  if (!c->memory) {
    start_tripped(c, CORE_CAUSE_MEMORY);
    return;
  }
  if (!read_slots(c)) c->memory = 0;
  if (!erased || c->slot != NO_SLOT) read_latch(c, image, reset_kind);
  c->latch_dirty = 1; /* so that a half-written picture is made whole */
}

static void memory_fails(struct core *c) {
  c->memory = 0;
  if (c->state == CORE_ARMED) core_trip(c, CORE_CAUSE_MEMORY);
}

/* What came of bringing one byte to its wanted value. */
enum step { STEP_SAME, STEP_WROTE, STEP_WAIT };

static uint8_t bring(struct core *c, uint16_t address, uint8_t byte) {
  int16_t now = c->port->nv_read(c->port->ctx, address);
  if (now == (int16_t)byte) return STEP_SAME;
  if (now == -1) return STEP_WAIT;
  if (now < -1 || c->nv_tries >= TRIES_MAX) {
    memory_fails(c);
    return STEP_WAIT;
  }
  if (c->port->nv_write(c->port->ctx, address, byte)) return STEP_WAIT;
  c->nv_tries = (uint8_t)(c->nv_tries + 1u);
  c->counts.writes++;
  return STEP_WROTE;
}

static uint8_t write_picture(struct core *c) {
  for (uint8_t i = 0; i < IMAGE_BYTES; i++) {
    uint8_t step = bring(c, i, wanted(c, i));
    if (step != STEP_SAME) return step;
  }
  c->latch_dirty = 0;
  c->nv_tries = 0;
  return STEP_SAME;
}

static uint8_t write_slot(struct core *c) {
  uint8_t slot = next_slot(c);
  for (uint8_t i = 0; i < SLOT_BYTES; i++) {
    uint16_t at = (uint16_t)(SLOTS_AT + (uint16_t)slot * SLOT_BYTES + i);
    uint8_t step = bring(c, at, slot_byte(next_boot(c), slot, i));
    if (step != STEP_SAME) return step;
  }
  c->boot = next_boot(c);
  c->slot = slot;
  c->advanced = 2;
  c->nv_tries = 0;
  return STEP_SAME;
}

/** Brings memory a byte or a few nearer to what it should say; the latch goes before the counter. */
void core_memory_pass(struct core *c) {
  for (uint8_t i = 0; i < IMAGE_BYTES && c->memory; i++) {
    uint8_t step = STEP_SAME;
    if (c->latch_dirty) {
      step = write_picture(c);
    } else if (c->advanced == 1u) {
      step = write_slot(c);
    } else {
      return;
    }
    if (step == STEP_WAIT) return;
  }
}
