/*
 * Protection by the board's own measurements. Whatever is found while armed is a trip; while dark a
 * bad case only forbids arming, and current that flows although the bench is dark latches always.
 */
#include "parts.h"

#define OVER_MS 30u         /* a slow converter: one conversion over the ceiling, this long */
#define OVER_IN_A_ROW 2u
#define FAULT_READINGS 5u
#define STEPS_MIN 2u /* of the converter: noise that is no over-current */

/** Conversions since boot. The interrupt may count between two bytes: read until two agree. */
uint16_t core_conversions(const struct core *c) {
  uint16_t a = c->wire.conversions;
  for (uint8_t i = 0; i < 4u; i++) {
    uint16_t b = c->wire.conversions;
    if (a == b) break;
    a = b;
  }
  return a;
}

void core_conversion(struct core *c, uint16_t current_counts, uint32_t tick) {
  (void)tick; /* a stopped converter is judged by the main loop's own tick */
  struct core_wire *w = &c->wire;
  w->conversions = (uint16_t)(w->conversions + 1u);
  if (!w->lit || (current_counts <= w->limit[w->limit_index] && !w->inject_over)) {
    w->over = 0;
    return;
  }
  if (w->over < OVER_IN_A_ROW) w->over = (uint8_t)(w->over + 1u);
  if (w->over < OVER_IN_A_ROW) return;
  c->port->cut(c->port->ctx);
  if (w->cause == 0u) w->cause = CORE_CAUSE_OVER_CEILING;
}

/* Counts of current that this drive means. */
static uint32_t meant(const struct core *c, uint16_t drive) {
  return (uint32_t)drive * c->board->current_num / c->board->current_den;
}

static uint32_t greater(uint32_t a, uint32_t b) {
  return a > b ? a : b;
}

/** The limit of a single conversion: highest ceiling of the last fall time, 1 % or 2 counts more. */
void core_limit_conversions(struct core *c) {
  struct core_wire *w = &c->wire;
  uint32_t top = meant(c, core_peak_top(&c->ceilings));
  uint32_t noise = (uint32_t)STEPS_MIN * c->board->current_step;
  uint32_t limit = greater(top + greater(top / 100u, noise), c->board->dark_current);
  uint8_t other = (uint8_t)(w->limit_index ^ 1u);
  w->limit[other] = (uint16_t)(limit > 0xFFFFu ? 0xFFFFu : limit);
  w->limit_index = other;
}

static uint8_t as_warm(const struct core *c, int32_t counts, int32_t limit) {
  return (uint8_t)(c->board->case_warm_is_low ? counts <= limit : counts >= limit);
}

/* The reading for protection: an injection only ever makes it worse. */
static int32_t judged_case(const struct core *c, int32_t counts) {
  const CORE_FLASH struct core_board *b = c->board;
  if (core_injected(c, ROW_CASE_OPEN) && counts < b->case_open) return b->case_open;
  if (core_injected(c, ROW_CASE_SHORT) && counts > b->case_short) return b->case_short;
  if (core_injected(c, ROW_CASE_OVER) && !as_warm(c, counts, b->case_over)) return b->case_over;
  return counts;
}

static void keep_for_median(struct core *c, int32_t counts) {
  c->median[c->median_next] = counts;
  c->median_next = (uint8_t)(c->median_next + 1u < CORE_MEDIAN ? c->median_next + 1u : 0u);
  if (c->median_count < CORE_MEDIAN) c->median_count = (uint8_t)(c->median_count + 1u);
}

static int32_t median(const struct core *c) {
  int32_t sorted[CORE_MEDIAN];
  for (uint8_t i = 0; i < c->median_count; i++) {
    uint8_t at = i;
    for (; at > 0u && sorted[at - 1u] > c->median[i]; at--) sorted[at] = sorted[at - 1u];
    sorted[at] = c->median[i];
  }
  return sorted[c->median_count / 2u];
}

static void trip_if_armed(struct core *c, uint8_t fact, uint8_t cause) {
  if (fact && c->state == CORE_ARMED) core_trip(c, cause);
}

/* Five readings in a row or the board's time, whichever comes first. */
static uint8_t sensor_fault(struct core *c, struct core_since *since, uint8_t *readings,
                            uint8_t fact, uint32_t tick) {
  *readings = (uint8_t)(!fact ? 0u : (*readings < FAULT_READINGS ? *readings + 1u : *readings));
  uint8_t long_enough = core_held(c, since, fact, tick, c->board->case_fault_ms);
  return (uint8_t)(long_enough || *readings >= FAULT_READINGS);
}

static void judge_case(struct core *c, int32_t reading, uint32_t tick) {
  int32_t counts = judged_case(c, reading);
  uint8_t open = (uint8_t)(counts >= c->board->case_open);
  uint8_t shorted = (uint8_t)(counts <= c->board->case_short);
  uint8_t open_now = sensor_fault(c, &c->case_open, &c->open_readings, open, tick);
  uint8_t short_now = sensor_fault(c, &c->case_short, &c->short_readings, shorted, tick);
  if (!open && !shorted) {
    keep_for_median(c, counts);
    c->case_counts = counts;
  }
  c->case_over = (uint8_t)(c->median_count > 0u && as_warm(c, median(c), c->board->case_over));
  c->case_ok = (uint8_t)(!open && !shorted && !c->case_over);
  trip_if_armed(c, open_now, CORE_CAUSE_CASE_OPEN);
  trip_if_armed(c, short_now, CORE_CAUSE_CASE_SHORT);
  trip_if_armed(c, c->case_over, CORE_CAUSE_CASE_OVER);
}

static void judge_supply(struct core *c, int32_t counts, uint32_t tick) {
  const CORE_FLASH struct core_board *b = c->board;
  if (core_injected(c, ROW_SUPPLY_LOW) && counts > b->supply_low) counts = b->supply_low;
  uint8_t low = (uint8_t)(counts <= b->supply_low);
  uint8_t high = (uint8_t)(counts >= b->supply_high);
  trip_if_armed(c, core_held(c, &c->supply_low, low, tick, b->supply_ms), CORE_CAUSE_SUPPLY_LOW);
  trip_if_armed(c, core_held(c, &c->supply_high, high, tick, b->supply_ms),
                CORE_CAUSE_SUPPLY_HIGH);
}

static void judge_current(struct core *c, int32_t counts, uint32_t tick) {
  const CORE_FLASH struct core_board *b = c->board;
  uint32_t current = counts > 0 ? (uint32_t)counts : 0u;
  uint16_t top = core_peak_top(&c->drives);
  uint32_t most = meant(c, top);
  /* 5 %; near zero an offset of the converter is no hazard: a quarter of the dark limit at least. */
  most = greater(most + greater(most / 20u, b->dark_current / 4u), b->dark_current);
  c->flowing = (uint8_t)(current > b->dark_current);
  uint8_t above = (uint8_t)(top > 0u && current > most);
  uint8_t stray = (uint8_t)(top == 0u && c->flowing);
  trip_if_armed(c, core_held(c, &c->follow, above, tick, b->follow_ms), CORE_CAUSE_OVER_AIM);
  if (core_held(c, &c->dark_current, stray, tick, b->dark_current_ms)) {
    core_trip(c, CORE_CAUSE_DARK_CURRENT);
  }
}

/** Judges a complete set of averaged readings. */
void core_judge_readings(struct core *c, const int32_t *values, uint32_t tick) {
  const CORE_FLASH struct core_board *b = c->board;
  judge_current(c, values[b->current], tick);
  judge_case(c, values[b->case_], tick);
  if (b->supply != CORE_NO_CHANNEL) judge_supply(c, values[b->supply], tick);
}

/** Makes trips of what interrupts cut. They write a cause only where none stands. */
void core_take_cuts(struct core *c) {
  struct core_wire *w = &c->wire;
  if (w->dark) {
    w->dark = 0;
    core_bare_dark(c);
  }
  uint8_t cause = w->cause;
  if (cause == 0u) return;
  trip_if_armed(c, 1, cause);
  w->cause = 0;
}

/** Watches for what only time can show: one slow conversion over the ceiling, a stopped converter. */
void core_guard_pass(struct core *c) {
  core_take_cuts(c);
  uint8_t over = (uint8_t)(c->wire.lit && c->wire.over > 0u);
  trip_if_armed(c, core_held(c, &c->over, over, c->tick, OVER_MS), CORE_CAUSE_OVER_CEILING);
  uint16_t conversions = core_conversions(c);
  uint8_t still = (uint8_t)(conversions == c->converter_last);
  c->converter_last = conversions;
  uint8_t stopped = core_held(c, &c->converter, still, c->tick, c->board->converter_stop_ms);
  trip_if_armed(c, stopped, CORE_CAUSE_CONVERTER_STOPPED);
}
