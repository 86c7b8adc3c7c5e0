/* The sample line, its status bits, and the ring of samples that a permit may name. */
#include "parts.h"

/* Each fact in its place, lowest bit first. */
static uint16_t status_bits(const struct core *c) {
  uint8_t reason = core_arm_refusal(c);
  uint8_t armed = (uint8_t)(c->state == CORE_ARMED);
  const uint8_t facts[15] = {
      (uint8_t)(c->drive > 0u),
      armed,
      (uint8_t)(c->state == CORE_TRIPPED),
      c->key,
      c->loop,
      c->fan,
      c->limited,
      (uint8_t)(c->injection != 0u),
      c->hand.on,
      (uint8_t)(reason != REASON_NONE && reason != WORD_STATE),
      c->delay.on,
      (uint8_t)(c->anchor_count > 0u && c->anchor_seq == c->seq),
      c->indicator,
      0,
      (uint8_t)(c->curve[c->committed].count > 0u)};
  uint16_t bits = 0;
  for (uint8_t i = 0; i < sizeof facts; i++) {
    if (facts[i]) bits = (uint16_t)(bits | (uint16_t)(1u << i));
  }
  return bits;
}

/* An anchor older than the longest term is of no use, so 16 bits of its tick are enough. */
static void keep_anchor(struct core *c, uint32_t tick) {
  uint16_t term_max = c->board->term_max;
  if (tick - c->anchor_newest_tick > term_max) c->anchor_count = 0;
  c->anchor_newest = (uint8_t)((c->anchor_newest + 1u) % CORE_ANCHORS);
  c->anchor_tick[c->anchor_newest] = (uint16_t)tick;
  c->anchor_newest_tick = tick;
  c->anchor_seq = c->seq;
  if (c->anchor_count < CORE_ANCHORS) c->anchor_count = (uint8_t)(c->anchor_count + 1u);
  for (uint8_t i = 0; i < CORE_ANCHORS && c->anchor_count > 1u; i++) {
    uint8_t oldest = (uint8_t)((uint8_t)(c->anchor_newest + 1u - c->anchor_count) % CORE_ANCHORS);
    if ((uint16_t)((uint16_t)tick - c->anchor_tick[oldest]) <= term_max) break;
    c->anchor_count = (uint8_t)(c->anchor_count - 1u);
  }
}

/** The tick of anchor `n`; 0 when n is in no place of the ring. */
uint8_t core_anchor_tick(const struct core *c, uint32_t n, uint32_t *tick) {
  uint32_t back = c->anchor_seq - n;
  uint8_t every = c->board->anchor_every;
  if (back >= (uint32_t)every * CORE_ANCHORS || back % every != 0u) return 0;
  uint8_t places = (uint8_t)(back / every);
  if (places >= c->anchor_count) return 0;
  uint8_t at = (uint8_t)((uint8_t)(c->anchor_newest - places) % CORE_ANCHORS);
  *tick = c->anchor_newest_tick - (uint16_t)((uint16_t)c->anchor_newest_tick - c->anchor_tick[at]);
  return 1;
}

/* The next slower group that has channels; 0 when there is none. */
static uint8_t next_group(const struct core *c) {
  uint8_t first = 0, next = 0;
  for (uint8_t i = 0; i < c->board->channel_count; i++) {
    uint8_t group = c->board->channels[i].group;
    if (group > 0u && (first == 0u || group < first)) first = group;
    if (group > c->group && (next == 0u || group < next)) next = group;
  }
  return next != 0u ? next : first;
}

static void put_group(struct core *c, const int32_t *values, uint8_t group) {
  for (uint8_t i = 0; i < c->board->channel_count; i++) {
    if (c->board->channels[i].group != group) continue;
    core_put_i32(c, i == c->board->set ? (int32_t)c->drive : values[i]);
  }
}

static void put_acknowledgement(struct core *c) {
  if (c->permit.seen) {
    core_put_u32(c, c->permit.n);
    core_put_u32(c, c->permit.age);
    return;
  }
  core_put_space(c);
  core_put_char(c, '-');
  core_put_space(c);
  core_put_char(c, '-');
}

/** Sends the sample of these readings; without room the host sees a gap in SEQ. */
void core_send_sample(struct core *c, const int32_t *values, uint32_t tick) {
  c->seq++;
  if (c->anchor_wait == 0u) {
    c->anchor_wait = c->board->anchor_every;
    keep_anchor(c, tick);
  }
  c->anchor_wait = (uint8_t)(c->anchor_wait - 1u);
  c->group = next_group(c);
  core_put_line(c, WORD_SAMPLE);
  core_put_u32(c, c->seq);
  core_put_u32(c, tick);
  core_put_h16(c, status_bits(c));
  core_put_u32(c, c->cause);
  put_acknowledgement(c);
  core_put_u32(c, core_conversions(c));
  core_put_u32(c, c->group);
  put_group(c, values, 0);
  if (c->group > 0u) put_group(c, values, c->group);
  (void)core_put_send(c);
}

void core_reading(struct core *c, const int32_t *values, uint32_t tick) {
  core_take_cuts(c); /* or the sample would tell of light that an interrupt has ended */
  core_judge_readings(c, values, tick);
  core_send_sample(c, values, tick);
}
