/* From the permit to the drive: expiry, emission delay, clip, slew. Down at once, up by the slew. */
#include "parts.h"

#define FIRST_PERMIT_MS 2000u
#define IDLE_MS 120000ul            /* armed, no light yet */
#define IDLE_AFTER_LIGHT_MS 3600000ul
#define ZERO_MS 10000u              /* longer at zero, and the emission delay runs again */
#define SLEW_STEP_US 100000ul       /* a late pass catches up no further than this */
#define US_PER_S 1000000ul

/** Ends what has run out. Expiry is by the tick of the judged sample. */
void core_expiry_pass(struct core *c) {
  if (c->state != CORE_ARMED) return;
  struct core_permit *p = &c->permit;
  if (p->live && c->tick - p->n_tick >= p->term) {
    core_trip(c, CORE_CAUSE_PERMIT_EXPIRED);
    return;
  }
  if (core_past(c, &c->opened, c->tick, FIRST_PERMIT_MS)) {
    core_trip(c, CORE_CAUSE_PERMIT_EXPIRED);
    return;
  }
  CORE_ASSERT(c, p->live || c->opened.on);
  uint8_t idle = (uint8_t)(!p->live || p->aim == 0u);
  if (core_held(c, &c->idle, idle, c->tick, c->was_lit ? IDLE_AFTER_LIGHT_MS : IDLE_MS)) {
    core_stand_down(c, CORE_CAUSE_ARMED_IDLE);
  }
}

static uint16_t least(uint16_t a, uint16_t b) {
  return a < b ? a : b;
}

/* What the permit, the board and the curve allow now; notes whether the board clips. */
static uint16_t allowed(struct core *c) {
  c->ceiling = 0;
  c->limited = 0;
  if (c->state != CORE_ARMED || !c->permit.live) return 0;
  uint16_t own = least(c->board->absolute,
                       core_curve_at(&c->curve[c->committed], c->case_counts));
  c->ceiling = least(c->permit.cap, own);
  c->limited = (uint8_t)(own < c->permit.aim);
  /* Light only once the lit mark stands: a reset must find it. */
  if (c->latch_dirty || !c->memory) return 0;
  return least(c->permit.aim, c->ceiling);
}

/* Zero while the emission delay runs; starts it after more than ten seconds of zero. */
static uint16_t delayed(struct core *c, uint16_t wanted) {
  if (c->state != CORE_ARMED) return 0;
  if (c->drive > 0u) {
    c->zero.on = 0;
    return wanted;
  }
  if (!c->zero.on) core_since_start(&c->zero, c->tick);
  if (!c->delay.on && wanted > 0u && c->tick - c->zero.tick > core_ticks(c, ZERO_MS)) {
    core_since_start(&c->delay, c->tick);
  }
  if (!c->delay.on) return wanted;
  if (!core_past(c, &c->delay, c->tick, c->board->emission_delay_ms)) return 0;
  c->delay.on = 0;
  core_since_start(&c->zero, c->tick);
  return wanted;
}

static uint16_t slewed(struct core *c, uint16_t wanted) {
  uint32_t ticks = c->tick - c->slew_tick;
  c->slew_tick = c->tick;
  if (wanted <= c->drive) {
    c->slew_rest = 0;
    return wanted;
  }
  uint32_t us = SLEW_STEP_US;
  if (ticks < SLEW_STEP_US / c->board->tick_us) us = ticks * c->board->tick_us;
  c->slew_rest += us * c->board->slew_countsPerS;
  uint32_t step = c->slew_rest / US_PER_S;
  c->slew_rest %= US_PER_S;
  uint16_t room = (uint16_t)(wanted - c->drive);
  return (uint16_t)(c->drive + (step < room ? (uint16_t)step : room));
}

/** Commands the drive for this pass and tells the interrupt how much current it may mean. */
void core_drive_pass(struct core *c) {
  const CORE_FLASH struct core_board *b = c->board;
  core_peak_pass(c, &c->ceilings, c->ceiling, b->fall_ms);
  /* An averaged reading reaches back a sample period, and its average another. */
  core_peak_pass(c, &c->drives, c->drive, b->fall_ms + 2000ul / b->rate_perS);
  uint16_t drive = slewed(c, delayed(c, allowed(c)));
  CORE_ASSERT(c, drive == 0u || (c->permit.live && drive <= c->permit.cap && drive <= b->absolute));
  if (c->state != CORE_ARMED) drive = 0;
  c->drive = drive;
  if (drive > 0u) c->was_lit = 1;
  core_peak_add(&c->ceilings, c->ceiling);
  core_peak_add(&c->drives, drive);
  core_limit_conversions(c);
  c->port->set_drive(c->port->ctx, drive);
}
