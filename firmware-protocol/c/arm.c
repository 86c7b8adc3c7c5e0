/*
 * Arming, and the one-time numbers of arming and injecting.
 *
 * A number works once, right or wrong. The answer binds it to this board as it is now, so that
 * neither an echo, nor a replay, nor a host with another idea of the board can arm it.
 */
#include "parts.h"

#define NUMBER_MS 10000u
#define BACKOFF_MS 30000u
#define WRONG_MAX 3u
#define ASK_MS 150u /* the answer must leave within 200 ms */
#define SALT_NUMBER 0x6E756D62ul
#define SALT_SESSION 0x73657373ul

/* 32 bits from counters that never repeat and from jitter. */
static uint32_t token(const struct core *c, uint32_t salt) {
  uint32_t crc = core_crc32_add_u32(CORE_CRC32_START, salt);
  crc = core_crc32_add_u32(crc, c->boot);
  crc = core_crc32_add_u32(crc, c->arms);
  crc = core_crc32_add_u32(crc, c->offers);
  crc = core_crc32_add_u32(crc, c->tick);
  return CORE_CRC32_END(core_crc32_add_u32(crc, c->port->jitter(c->port->ctx)));
}

/** Why arming is refused now, a word, or REASON_NONE. */
uint8_t core_arm_refusal(const struct core *c) {
  if (c->state != CORE_STANDBY) return WORD_STATE;
  if (!c->memory) return WORD_MEMORY;
  if (c->boot == 0xFFFFFFFFul && c->advanced == 0u) return WORD_WORN;
  if (!c->key) return WORD_KEY;
  if (!c->loop) return WORD_LOOP;
  if (!c->case_ok) return WORD_CASE;
  if (c->curve[c->committed].count == 0u) return WORD_CURVE;
  if (c->injection) return WORD_INJECTED;
  if (c->backoff.on) return WORD_BACK_OFF;
  return REASON_NONE;
}

static void offer(struct core *c, uint8_t kind) {
  c->offers = (uint16_t)(c->offers + 1u);
  c->offer.number = token(c, SALT_NUMBER);
  c->offer.tick = c->tick;
  c->offer.kind = kind;
  core_put_line(c, WORD_OFFER);
  core_put_space(c);
  core_put_word(c, kind == OFFER_ARM ? WORD_ARM : WORD_INJECT);
  core_put_h32(c, c->offer.number);
  core_put_u32(c, c->boot);
  core_put_u32(c, c->arms);
  (void)core_put_send(c);
}

static uint8_t inject_refusal(const struct core *c) {
  if (!c->board->inject) return WORD_CAPABILITY;
  if (c->state == CORE_TRIPPED) return WORD_STATE;
  if (c->injection) return WORD_INJECTED;
  if (c->backoff.on) return WORD_BACK_OFF;
  return REASON_NONE;
}

void core_obey_ask(struct core *c, const struct core_order *o) {
  uint8_t arming = (uint8_t)(o->arg[0] == OFFER_ARM);
  uint8_t reason = arming ? core_arm_refusal(c) : inject_refusal(c);
  if (reason != REASON_NONE) {
    core_refuse(c, VERB_ASK, reason);
  } else if (!arming) {
    offer(c, OFFER_INJECT);
  } else {
    /* The boot counter must stand in memory before a number made from it is given out. */
    if (c->advanced == 0u) c->advanced = 1;
    core_since_start(&c->asking, c->tick);
  }
}

static void ask_pass(struct core *c) {
  if (!c->asking.on) return;
  if (c->advanced == 2u) {
    c->asking.on = 0;
    offer(c, OFFER_ARM);
  } else if (core_past(c, &c->asking, c->tick, ASK_MS) || !c->memory) {
    c->asking.on = 0;
    core_refuse(c, VERB_ASK, WORD_MEMORY);
  }
}

/** Answers a waiting ask; ends a number and a back-off whose time is over. */
void core_offer_pass(struct core *c) {
  ask_pass(c);
  if (c->offer.kind != OFFER_NONE && c->tick - c->offer.tick >= core_ticks(c, NUMBER_MS)) {
    c->offer.kind = OFFER_NONE;
  }
  if (core_past(c, &c->backoff, c->tick, BACKOFF_MS)) c->backoff.on = 0;
}

/* CRC-32 of the text that PROTOCOL.md gives, made in the line's own buffer. */
static uint32_t right_answer(struct core *c) {
  core_put_start(c);
  core_put_h32(c, c->offer.number);
  core_put_u32(c, c->boot);
  core_put_u32(c, c->arms);
  core_put_h32(c, c->curve_crc);
  core_put_u32(c, c->board->absolute);
  core_put_u32(c, c->board->term_min);
  core_put_u32(c, c->board->term_max);
  core_put_u32(c, CORE_PROTOCOL);
  core_put_space(c);
  core_put_flash(c, c->board->firmware);
  uint32_t crc = CORE_CRC32_START;
  for (uint8_t i = 1; i < c->line_length; i++) crc = core_crc32_add(crc, c->line[i]);
  return CORE_CRC32_END(crc);
}

/** Spends the open number on this answer; why not, or REASON_NONE. */
uint8_t core_answer_refusal(struct core *c, uint8_t kind, uint32_t answer) {
  uint8_t open = (uint8_t)(c->offer.kind == kind);
  c->offer.kind = OFFER_NONE;
  if (!open) return WORD_NONE;
  if (answer == right_answer(c)) {
    c->wrong = 0;
    return REASON_NONE;
  }
  c->wrong = (uint8_t)(c->wrong + 1u);
  if (c->wrong >= WRONG_MAX) {
    c->wrong = 0;
    core_since_start(&c->backoff, c->tick);
  }
  return WORD_WRONG;
}

static void open_session(struct core *c) {
  uint32_t session = token(c, SALT_SESSION);
  c->session = session == 0u ? 1u : session;
  c->arms++;
  c->state = CORE_ARMED;
  c->permit.live = 0;
  c->permit.seen = 0;
  c->hand.on = 0;
  c->lit_mark = 1;
  c->latch_dirty = 1;
  core_since_start(&c->opened, c->tick);
  core_since_start(&c->idle, c->tick);
  core_since_start(&c->delay, c->tick);
  core_since_start(&c->zero, c->tick);
  c->follow.on = 0;
  c->converter.on = 0;
  c->over.on = 0;
  c->wire.over = 0;
  c->wire.lit = 1;
}

void core_obey_arm(struct core *c, const struct core_order *o) {
  uint8_t reason = core_answer_refusal(c, OFFER_ARM, o->arg[0]);
  if (reason == REASON_NONE) reason = core_arm_refusal(c);
  if (reason != REASON_NONE) {
    core_refuse(c, VERB_ARM, reason);
    return;
  }
  open_session(c);
  core_yes(c, VERB_ARM);
  core_put_h32(c, c->session);
  (void)core_put_send(c);
}
