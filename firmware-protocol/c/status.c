/* What a person at a terminal asks for, and capabilities that this core does not have. */
#include "parts.h"

void core_obey_status(struct core *c, const struct core_order *o) {
  (void)o;
  const struct core_counts *n = &c->counts;
  core_put_line(c, WORD_COUNTS);
  core_put_u32(c, n->good);
  core_put_u32(c, n->crc);
  core_put_u32(c, n->too_long);
  core_put_u32(c, n->form);
  core_put_u32(c, n->verb);
  core_put_u32(c, n->refused);
  core_put_u32(c, n->bare);
  core_put_u32(c, n->writes);
  core_put_u32(c, c->uptime_s);
  (void)core_put_send(c);
}

/** `cool` and `shutter`: known, refused. */
void core_obey_absent(struct core *c, const struct core_order *o) {
  core_refuse(c, o->verb, WORD_CAPABILITY);
}
