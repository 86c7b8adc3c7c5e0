/* Time by the board's tick alone: how long a thing has held, and the highest of a short while. */
#include "parts.h"

/** Ticks in `ms` milliseconds (at most 3600000), rounded up. */
uint32_t core_ticks(const struct core *c, uint32_t ms) {
  uint16_t tick_us = c->board->tick_us;
  if (tick_us == 1000u) return ms;
  return (ms * 1000u + tick_us - 1u) / tick_us;
}

void core_since_start(struct core_since *since, uint32_t tick) {
  since->tick = tick;
  since->on = 1;
}

/** 1 when it is on and has been for `ms` or longer. */
uint8_t core_past(const struct core *c, const struct core_since *since, uint32_t tick,
                  uint32_t ms) {
  return (uint8_t)(since->on && tick - since->tick >= core_ticks(c, ms));
}

/** Follows `fact`: 1 once it has held without a gap for `ms`. */
uint8_t core_held(const struct core *c, struct core_since *since, uint8_t fact, uint32_t tick,
                  uint32_t ms) {
  if (!fact) {
    since->on = 0;
    return 0;
  }
  if (!since->on) core_since_start(since, tick);
  return core_past(c, since, tick, ms);
}

/**
 * Lets time pass in a peak: `held` is the value that was in force until now. The slots together
 * cover at least `window_ms` and at most a quarter more.
 */
void core_peak_pass(const struct core *c, struct core_peak *p, uint16_t held, uint32_t window_ms) {
  uint32_t slot_ticks = (core_ticks(c, window_ms) + CORE_PEAK_SLOTS - 2u) / (CORE_PEAK_SLOTS - 1u);
  for (uint8_t i = 0; i < CORE_PEAK_SLOTS && c->tick - p->tick >= slot_ticks; i++) {
    p->newest = (uint8_t)(p->newest + 1u < CORE_PEAK_SLOTS ? p->newest + 1u : 0u);
    p->slot[p->newest] = held;
    p->tick += slot_ticks;
  }
  if (c->tick - p->tick >= slot_ticks) p->tick = c->tick;
}

void core_peak_add(struct core_peak *p, uint16_t value) {
  if (value > p->slot[p->newest]) p->slot[p->newest] = value;
}

uint16_t core_peak_top(const struct core_peak *p) {
  uint16_t top = 0;
  for (uint8_t i = 0; i < CORE_PEAK_SLOTS; i++) {
    if (p->slot[i] > top) top = p->slot[i];
  }
  return top;
}
