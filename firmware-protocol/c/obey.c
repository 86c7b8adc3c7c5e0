/* What becomes of one received line: counted, looked at for dark, obeyed or refused. */
#include "parts.h"

static void count(struct core *c, uint8_t verdict) {
  switch (verdict) {
    case LINE_GOOD: c->counts.good++; break;
    case LINE_LONG: c->counts.too_long++; break;
    case LINE_CHAR:
    case LINE_DIRECTION:
    case LINE_CRC: c->counts.crc++; break;
    case LINE_VERB: c->counts.verb++; break;
    case LINE_FORM: c->counts.form++; break;
    default: break; /* an empty line is nothing */
  }
}

/** An unchecked dark, of whatever form: a trip while armed or emitting, else only counted. */
void core_bare_dark(struct core *c) {
  c->port->cut(c->port->ctx);
  c->counts.bare++;
  if (c->state == CORE_ARMED) {
    core_trip(c, CORE_CAUSE_BARE_DARK);
  } else {
    core_stand_down(c, CORE_CAUSE_BARE_DARK);
  }
}

/** Judges and obeys the line in c->line. Dark is looked for whatever the verdict. */
void core_obey_line(struct core *c) {
  struct core_order order;
  uint8_t verdict = core_judge_line(c->line, c->line_length, &order);
  count(c, verdict);
  uint8_t good = (uint8_t)(verdict == LINE_GOOD);
  if (core_begins_dark(c->line, c->line_length) && !(good && order.verb == VERB_DARK)) {
    core_bare_dark(c);
    return;
  }
  if (good) {
    core_obey_order(c, &order);
  } else if (verdict == LINE_FORM && order.verb != VERB_PERMIT) {
    core_refuse(c, order.verb, WORD_FORM);
  }
}
