/* Key, interlock loop, fan and hand. Opening counts at once, closing only when it stays closed. */
#include "parts.h"

#define CLOSING_MS 500u
#define HAND_MS 60000ul

void core_inputs(struct core *c, uint8_t key_on, uint8_t loop_closed, uint8_t fan_ok,
                 uint8_t hand) {
  c->key_raw = key_on;
  c->loop_raw = loop_closed;
  c->fan = (uint8_t)(fan_ok != 0u);
  if (!key_on) c->key_opened = 1;
  if (!loop_closed) c->loop_opened = 1;
  if (hand) c->hand_moved = 1;
  if (!c->wire.lit || (key_on && loop_closed)) return;
  c->port->cut(c->port->ctx);
  if (c->wire.cause == 0u) c->wire.cause = key_on ? CORE_CAUSE_LOOP_OPEN : CORE_CAUSE_KEY_OFF;
}

/* 1 while closed and stable; an opening between two passes is not missed. */
static uint8_t contact(struct core *c, uint8_t now, uint8_t closed, volatile uint8_t *opened,
                       struct core_since *closing) {
  uint8_t open = (uint8_t)(!closed || *opened);
  *opened = 0;
  uint8_t stable = core_held(c, closing, (uint8_t)!open, c->tick, CLOSING_MS);
  return (uint8_t)(!open && (now || stable));
}

/** Brings the stable view of the inputs up to date; trips where one opened while armed. */
void core_inputs_pass(struct core *c) {
  uint8_t key_in = (uint8_t)(c->key_raw && !core_injected(c, ROW_KEY));
  uint8_t loop_in = (uint8_t)(c->loop_raw && !core_injected(c, ROW_LOOP));
  c->key = contact(c, c->key, key_in, &c->key_opened, &c->key_closing);
  c->loop = contact(c, c->loop, loop_in, &c->loop_opened, &c->loop_closing);
  if (c->state == CORE_ARMED && !c->key) core_trip(c, CORE_CAUSE_KEY_OFF);
  if (c->state == CORE_ARMED && !c->loop) core_trip(c, CORE_CAUSE_LOOP_OPEN);
  if (c->hand_moved) {
    c->hand_moved = 0;
    core_since_start(&c->hand, c->tick);
  }
  if (core_past(c, &c->hand, c->tick, HAND_MS)) c->hand.on = 0;
}
