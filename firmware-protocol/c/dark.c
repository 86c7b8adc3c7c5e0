/* The ways to dark. The output is cut first; what is kept about it comes after. */
#include "parts.h"

/* Nothing that is still in any buffer counts after this: no token, no permit, no open number. */
static void end_session(struct core *c) {
  c->port->cut(c->port->ctx);
  c->wire.lit = 0;
  c->wire.over = 0;
  c->session = 0;
  c->permit.live = 0;
  c->permit.seen = 0;
  c->offer.kind = OFFER_NONE;
  c->opened.on = 0;
  c->idle.on = 0;
  c->delay.on = 0;
  c->zero.on = 0;
  c->was_lit = 0;
  c->drive = 0;
  c->ceiling = 0;
  c->slew_rest = 0;
  c->limited = 0;
  if (c->lit_mark) {
    c->lit_mark = 0;
    c->latch_dirty = 1;
  }
}

/** Dark and latched. The first cause stays. */
void core_trip(struct core *c, uint8_t cause) {
  end_session(c);
  if (c->state == CORE_TRIPPED) return;
  c->state = CORE_TRIPPED;
  c->cause = cause;
  c->latch_dirty = 1;
}

/** Dark without a latch: ordered by a person, or fallen back from idling. */
void core_stand_down(struct core *c, uint8_t cause) {
  end_session(c);
  if (c->state != CORE_ARMED) return;
  c->state = CORE_STANDBY;
  c->cause = cause;
}

/** The program found itself in an impossible state. */
void core_defect(struct core *c) {
  core_trip(c, CORE_CAUSE_DEFECT);
}

void core_obey_dark(struct core *c, const struct core_order *o) {
  uint8_t code = (uint8_t)o->arg[0];
  c->port->cut(c->port->ctx);
  if (code != CORE_CAUSE_PERSON && c->state == CORE_ARMED) {
    core_trip(c, code);
  } else {
    core_stand_down(c, code);
  }
  core_yes(c, VERB_DARK);
  core_put_u32(c, code);
  (void)core_put_send(c);
}

static uint8_t reset_refusal(const struct core *c, uint8_t cause) {
  if (c->state != CORE_TRIPPED) return WORD_STATE;
  if (cause != c->cause) return WORD_CAUSE;
  if (!c->key) return WORD_KEY;
  if (!c->loop) return WORD_LOOP;
  if (c->flowing) return WORD_CURRENT;
  return REASON_NONE;
}

void core_obey_reset(struct core *c, const struct core_order *o) {
  uint8_t cause = (uint8_t)o->arg[0];
  uint8_t reason = reset_refusal(c, cause);
  if (reason != REASON_NONE) {
    core_refuse(c, VERB_RESET, reason);
    return;
  }
  c->state = CORE_STANDBY;
  c->latch_dirty = 1;
  core_yes(c, VERB_RESET);
  core_put_u32(c, cause);
  (void)core_put_send(c);
}
