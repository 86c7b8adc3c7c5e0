/* Proof injections: a reading replaced for protection only, always toward its row's trip, for 5 s. */
#include "parts.h"

#define INJECT_MS 5000u

uint8_t core_injected(const struct core *c, uint8_t row) {
  return (uint8_t)(c->injection == row + 1u);
}

void core_obey_inject(struct core *c, const struct core_order *o) {
  uint8_t row = (uint8_t)o->arg[0];
  uint8_t reason = REASON_NONE;
  if (!c->board->inject) {
    reason = WORD_CAPABILITY;
  } else if (c->state == CORE_TRIPPED) {
    reason = WORD_STATE;
  } else if (row >= ROWS) {
    reason = WORD_RANGE;
  } else {
    reason = core_answer_refusal(c, OFFER_INJECT, o->arg[1]);
  }
  if (reason != REASON_NONE) {
    core_refuse(c, VERB_INJECT, reason);
    return;
  }
  c->injection = (uint8_t)(row + 1u);
  core_since_start(&c->injecting, c->tick);
  c->wire.inject_over = (uint8_t)(row == ROW_OVER_CEILING);
  core_yes(c, VERB_INJECT);
  core_put_space(c);
  for (uint8_t i = 0; core_row_letter(row, i) != 0; i++) core_put_char(c, core_row_letter(row, i));
  (void)core_put_send(c);
}

/** Ends an injection by itself. */
void core_inject_pass(struct core *c) {
  if (!core_past(c, &c->injecting, c->tick, INJECT_MS)) return;
  c->injecting.on = 0;
  c->injection = 0;
  c->wire.inject_over = 0;
}
