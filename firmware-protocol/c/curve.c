/* The board's own copy of the derating: staged in order, committed by checksum, checked for ever. */
#include "parts.h"

/**
 * Counts of set at `x` counts of case: interpolated, rounded down; zero outside the points and for
 * an empty curve.
 */
uint16_t core_curve_at(const struct core_curve *curve, int32_t x) {
  const struct core_point *p = curve->point;
  uint8_t n = curve->count;
  if (n == 0u || x < (int32_t)p[0].x || x > (int32_t)p[n - 1u].x) return 0;
  uint8_t i = 1;
  while (i + 1u < n && x > (int32_t)p[i].x) i = (uint8_t)(i + 1u);
  uint32_t span = (uint32_t)p[i].x - p[i - 1u].x;
  uint32_t along = (uint32_t)(x - (int32_t)p[i - 1u].x);
  uint16_t y0 = p[i - 1u].y, y1 = p[i].y;
  if (y1 >= y0) return (uint16_t)(y0 + (uint32_t)(y1 - y0) * along / span);
  uint32_t fall = (uint32_t)(y0 - y1) * along;
  return (uint16_t)(y0 - (fall / span + (fall % span != 0u ? 1u : 0u)));
}

static uint32_t point_crc(uint32_t crc, struct core_point p) {
  return core_crc32_add_u32(crc, (uint32_t)p.x | ((uint32_t)p.y << 16));
}

static uint32_t whole_crc(const struct core_curve *curve) {
  uint32_t crc = CORE_CRC32_START;
  for (uint8_t i = 0; i < curve->count; i++) crc = point_crc(crc, curve->point[i]);
  return CORE_CRC32_END(crc);
}

/* A damaged curve is no curve; while armed that is a trip. */
static void drop_curve(struct core *c) {
  c->curve[c->committed].count = 0;
  c->curve_crc = 0;
  if (c->state == CORE_ARMED) core_trip(c, CORE_CAUSE_CURVE_DAMAGED);
}

/** Re-checks one point a pass, and the whole by its checksum at the last. */
void core_curve_pass(struct core *c) {
  const struct core_curve *curve = &c->curve[c->committed];
  if (c->curve_crc == 0u) return;
  if (curve->count > CORE_POINTS_MAX || c->check_point >= curve->count) {
    drop_curve(c);
    return;
  }
  if (c->check_point == 0u) c->check_crc = CORE_CRC32_START;
  c->check_crc = point_crc(c->check_crc, curve->point[c->check_point]);
  c->check_point = (uint8_t)(c->check_point + 1u);
  if (c->check_point < curve->count) return;
  c->check_point = 0;
  uint32_t crc = CORE_CRC32_END(c->check_crc);
  if (crc != c->curve_crc) drop_curve(c);
}

static struct core_curve *staged(struct core *c) {
  return &c->curve[c->committed ^ 1u];
}

static void answer_u32(struct core *c, uint8_t verb, uint32_t value) {
  core_yes(c, verb);
  core_put_u32(c, value);
  (void)core_put_send(c);
}

void core_obey_stage(struct core *c, const struct core_order *o) {
  uint8_t count = (uint8_t)o->arg[0];
  if (c->state != CORE_STANDBY) {
    core_refuse(c, VERB_STAGE, WORD_STATE);
  } else if (count < CORE_POINTS_MIN || count > CORE_POINTS_MAX) {
    core_refuse(c, VERB_STAGE, WORD_RANGE);
  } else {
    c->stage_count = count;
    staged(c)->count = 0;
    answer_u32(c, VERB_STAGE, count);
  }
}

static uint8_t point_refusal(struct core *c, const struct core_order *o) {
  const struct core_curve *s = staged(c);
  if (c->state != CORE_STANDBY) return WORD_STATE;
  if (s->count >= c->stage_count || o->arg[0] != s->count) return WORD_ORDER;
  if (s->count > 0u && o->arg[1] <= s->point[s->count - 1u].x) return WORD_ORDER;
  if (o->arg[2] > c->board->absolute) return WORD_OVER;
  return REASON_NONE;
}

void core_obey_point(struct core *c, const struct core_order *o) {
  uint8_t reason = point_refusal(c, o);
  if (reason != REASON_NONE) {
    core_refuse(c, VERB_POINT, reason);
    return;
  }
  struct core_curve *s = staged(c);
  s->point[s->count].x = (uint16_t)o->arg[1];
  s->point[s->count].y = (uint16_t)o->arg[2];
  s->count = (uint8_t)(s->count + 1u);
  answer_u32(c, VERB_POINT, o->arg[0]);
}

static uint8_t commit_refusal(struct core *c, uint32_t crc) {
  if (c->state != CORE_STANDBY) return WORD_STATE;
  if (c->stage_count == 0u || staged(c)->count != c->stage_count) return WORD_ORDER;
  if (crc == 0u || whole_crc(staged(c)) != crc) return WORD_CHECKSUM;
  return REASON_NONE;
}

void core_obey_commit(struct core *c, const struct core_order *o) {
  uint8_t reason = commit_refusal(c, o->arg[0]);
  if (reason != REASON_NONE) {
    core_refuse(c, VERB_COMMIT, reason);
    return;
  }
  c->committed ^= 1u;
  c->curve_crc = o->arg[0];
  c->check_point = 0;
  c->stage_count = 0;
  core_yes(c, VERB_COMMIT);
  core_put_h32(c, c->curve_crc);
  (void)core_put_send(c);
}

void core_obey_readback(struct core *c, const struct core_order *o) {
  const struct core_curve *curve = &c->curve[c->committed];
  uint8_t i = (uint8_t)o->arg[0];
  if (i >= curve->count) {
    core_refuse(c, VERB_READBACK, curve->count == 0u ? WORD_CURVE : WORD_RANGE);
    return;
  }
  core_put_line(c, WORD_CURVE_LINE);
  core_put_u32(c, i);
  core_put_u32(c, curve->point[i].x);
  core_put_u32(c, curve->point[i].y);
  core_put_u32(c, curve->count);
  core_put_h32(c, c->curve_crc);
  (void)core_put_send(c);
}
