/* What the core's files share with one another, and nobody else needs. */
#ifndef BEAMSITTER_PARTS_H
#define BEAMSITTER_PARTS_H

#include "core.h"

/** An impossible state is our own defect: dark and latched, never carried on with. */
#define CORE_ASSERT(c, fact)            \
  do {                                  \
    if (!(fact)) core_defect(c);        \
  } while (0)

/* Words of the controller's lines; the texts stand in write.c in the same order. */
enum core_word {
  WORD_BOOT = 0, WORD_HELLO, WORD_CHANNEL, WORD_END, WORD_SAMPLE, WORD_OFFER, WORD_YES, WORD_NO,
  WORD_CURVE_LINE, WORD_COUNTS,
  WORD_POWER, WORD_BROWN_OUT, WORD_WATCHDOG, WORD_EXTERNAL, WORD_UNKNOWN,
  WORD_STATE, WORD_VERSION, WORD_SESSION, WORD_OLD, WORD_STALE, WORD_OVER, WORD_TERM, WORD_RANGE,
  WORD_FORM, WORD_CAPABILITY, WORD_KEY, WORD_LOOP, WORD_CASE, WORD_MEMORY, WORD_WORN, WORD_CURVE,
  WORD_CHECKSUM, WORD_ORDER, WORD_WRONG, WORD_NONE, WORD_BACK_OFF, WORD_CAUSE, WORD_INJECTED,
  WORD_CURRENT,
  WORD_ARM, WORD_INJECT
};

/* No refusal: WORD_BOOT is no reason. */
#define REASON_NONE WORD_BOOT

/* Verdicts on a received line, in the order in which they are looked for. */
enum core_verdict {
  LINE_GOOD = 0, LINE_EMPTY, LINE_LONG, LINE_CHAR, LINE_DIRECTION, LINE_CRC, LINE_VERB, LINE_FORM
};

/* Verbs, in the order of the table in parse.c. */
enum core_verb {
  VERB_WHO = 0, VERB_ASK, VERB_ARM, VERB_PERMIT, VERB_DARK, VERB_RESET, VERB_STAGE, VERB_POINT,
  VERB_COMMIT, VERB_READBACK, VERB_INJECT, VERB_COOL, VERB_SHUTTER, VERB_STATUS, VERBS
};

/* What an offer is for; also the first argument of ask. */
enum core_offer_kind { OFFER_NONE = 0, OFFER_ARM, OFFER_INJECT };

/* Rows a proof injection may name, in the order of the table in parse.c. */
enum core_row {
  ROW_CASE_OVER = 0, ROW_CASE_OPEN, ROW_CASE_SHORT, ROW_OVER_CEILING, ROW_KEY, ROW_LOOP,
  ROW_SUPPLY_LOW, ROWS
};

/** A good line as numbers. */
struct core_order {
  uint8_t verb;
  uint8_t count; /* of arg */
  uint32_t arg[CORE_ARGS_MAX];
};

/* crc.c */
uint16_t core_crc16_add(uint16_t crc, uint8_t byte);
uint32_t core_crc32_add(uint32_t crc, uint8_t byte);
uint32_t core_crc32_add_u32(uint32_t crc, uint32_t value);
uint16_t core_crc16(const uint8_t *bytes, uint16_t length);
#define CORE_CRC16_START 0xFFFFu
#define CORE_CRC32_START 0xFFFFFFFFul
#define CORE_CRC32_END(crc) ((crc) ^ 0xFFFFFFFFul)

/* time.c */
uint32_t core_ticks(const struct core *c, uint32_t ms);
uint8_t core_past(const struct core *c, const struct core_since *since, uint32_t tick, uint32_t ms);
uint8_t core_held(const struct core *c, struct core_since *since, uint8_t fact, uint32_t tick,
                  uint32_t ms);
void core_since_start(struct core_since *since, uint32_t tick);
void core_peak_pass(const struct core *c, struct core_peak *p, uint16_t held, uint32_t window_ms);
void core_peak_add(struct core_peak *p, uint16_t value);
uint16_t core_peak_top(const struct core_peak *p);

/* line.c */
uint8_t core_line_take(struct core *c);
uint8_t core_begins_dark(const uint8_t *bytes, uint8_t length);

/* parse.c */
uint8_t core_judge_line(const uint8_t *line, uint16_t length, struct core_order *order);
void core_obey_order(struct core *c, const struct core_order *order);
char core_verb_letter(uint8_t verb, uint8_t at);
char core_row_letter(uint8_t row, uint8_t at);

/* obey.c */
void core_obey_line(struct core *c);
void core_bare_dark(struct core *c);

/* write.c */
void core_put_start(struct core *c);
void core_put_char(struct core *c, char letter);
void core_put_word(struct core *c, uint8_t word);
void core_put_line(struct core *c, uint8_t word);
void core_put_flash(struct core *c, const CORE_FLASH char *text);
void core_put_u32(struct core *c, uint32_t value);
void core_put_i32(struct core *c, int32_t value);
void core_put_h16(struct core *c, uint16_t value);
void core_put_h32(struct core *c, uint32_t value);
void core_put_space(struct core *c);
uint8_t core_put_send(struct core *c);
void core_yes(struct core *c, uint8_t verb);
void core_no(struct core *c, uint8_t verb, uint8_t reason);
void core_refuse(struct core *c, uint8_t verb, uint8_t reason);

/* introduce.c */
void core_obey_who(struct core *c, const struct core_order *o);
void core_introduce_pass(struct core *c);
void core_send_boot(struct core *c, uint8_t reset_kind);

/* arm.c */
uint8_t core_arm_refusal(const struct core *c);
void core_obey_ask(struct core *c, const struct core_order *o);
void core_obey_arm(struct core *c, const struct core_order *o);
uint8_t core_answer_refusal(struct core *c, uint8_t kind, uint32_t answer);
void core_offer_pass(struct core *c);

/* permit.c */
void core_obey_permit(struct core *c, const struct core_order *o);

/* dark.c */
void core_trip(struct core *c, uint8_t cause);
void core_stand_down(struct core *c, uint8_t cause);
void core_defect(struct core *c);
void core_obey_dark(struct core *c, const struct core_order *o);
void core_obey_reset(struct core *c, const struct core_order *o);

/* drive.c */
void core_drive_pass(struct core *c);
void core_expiry_pass(struct core *c);

/* guard.c */
void core_judge_readings(struct core *c, const int32_t *values, uint32_t tick);
void core_take_cuts(struct core *c);
void core_guard_pass(struct core *c);
uint16_t core_conversions(const struct core *c);
void core_limit_conversions(struct core *c);

/* curve.c */
uint16_t core_curve_at(const struct core_curve *curve, int32_t x);
void core_curve_pass(struct core *c);
void core_obey_stage(struct core *c, const struct core_order *o);
void core_obey_point(struct core *c, const struct core_order *o);
void core_obey_commit(struct core *c, const struct core_order *o);
void core_obey_readback(struct core *c, const struct core_order *o);

/* latch.c */
void core_memory_start(struct core *c, uint8_t reset_kind);
void core_memory_pass(struct core *c);

/* sample.c */
void core_send_sample(struct core *c, const int32_t *values, uint32_t tick);
uint8_t core_anchor_tick(const struct core *c, uint32_t n, uint32_t *tick);

/* inject.c */
void core_obey_inject(struct core *c, const struct core_order *o);
void core_inject_pass(struct core *c);
uint8_t core_injected(const struct core *c, uint8_t row);

/* inputs.c */
void core_inputs_pass(struct core *c);

/* status.c */
void core_obey_absent(struct core *c, const struct core_order *o);
void core_obey_status(struct core *c, const struct core_order *o);

#endif
