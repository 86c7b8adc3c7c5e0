/*
 * The permit: the one line that raises current.
 *
 * Its term counts from the tick of the sample it was judged on, by this board's ring and clock, so
 * that a delay in any buffer only ever shortens it.
 */
#include "parts.h"

enum { SESSION = 0, N, CAP, AIM, TERM };

/* `stale` by signed distance: numbers wrap. */
static uint8_t newer(uint32_t a, uint32_t b) {
  uint32_t distance = a - b;
  return (uint8_t)(distance != 0u && distance < 0x80000000ul);
}

static uint8_t refusal(const struct core *c, const struct core_order *o, uint32_t *n_tick) {
  const CORE_FLASH struct core_board *b = c->board;
  uint32_t cap = o->arg[CAP], aim = o->arg[AIM], term = o->arg[TERM];
  uint16_t aim_now = c->permit.live ? c->permit.aim : 0u;
  if (c->state != CORE_ARMED || o->arg[SESSION] != c->session) return WORD_SESSION;
  if (o->count > TERM + 1u) return WORD_CAPABILITY; /* a dither */
  if (!core_anchor_tick(c, o->arg[N], n_tick)) return WORD_UNKNOWN;
  if (c->permit.seen && !newer(o->arg[N], c->permit.n)) return WORD_STALE;
  if (term < b->term_min || term > b->term_max) return WORD_TERM;
  if (c->tick - *n_tick >= term) return WORD_OLD;
  if (cap > b->absolute || aim > cap) return WORD_OVER;
  if (c->injection && aim > aim_now) return WORD_INJECTED;
  return REASON_NONE;
}

void core_obey_permit(struct core *c, const struct core_order *o) {
  uint32_t n_tick = 0;
  uint8_t reason = refusal(c, o, &n_tick);
  if (reason != REASON_NONE) {
    core_no(c, VERB_PERMIT, reason);
    core_put_u32(c, o->arg[N]);
    (void)core_put_send(c);
    return;
  }
  uint32_t age = c->tick - n_tick;
  struct core_permit *p = &c->permit;
  p->n = o->arg[N];
  p->n_tick = n_tick;
  p->cap = (uint16_t)o->arg[CAP];
  p->aim = (uint16_t)o->arg[AIM];
  p->term = (uint16_t)o->arg[TERM];
  p->age = (uint16_t)(age > 0xFFFFu ? 0xFFFFu : age);
  p->seen = 1;
  p->live = 1;
  c->opened.on = 0;
  CORE_ASSERT(c, p->aim <= p->cap && p->cap <= c->board->absolute);
  CORE_ASSERT(c, age < p->term);
}
