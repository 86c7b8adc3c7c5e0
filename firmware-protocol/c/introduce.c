/* Who the board is: the boot line, hello, the manifest and its checksum. */
#include "parts.h"

#define LINES_PER_PASS 4u
#define INTRO_HELLO 1u
#define INTRO_CHANNELS 2u /* channel i is line i + 2 */

void core_send_boot(struct core *c, uint8_t reset_kind) {
  uint8_t kind = reset_kind > CORE_UNKNOWN ? (uint8_t)CORE_UNKNOWN : reset_kind;
  core_put_line(c, WORD_BOOT);
  core_put_space(c);
  core_put_flash(c, c->board->firmware);
  core_put_space(c);
  core_put_word(c, (uint8_t)(WORD_POWER + kind));
  (void)core_put_send(c);
}

void core_obey_who(struct core *c, const struct core_order *o) {
  if (c->state == CORE_ARMED) {
    /* A second or restarted host never meets a lit board. */
    core_trip(c, CORE_CAUSE_SECOND_INTRODUCTION);
    core_refuse(c, VERB_WHO, WORD_STATE);
    return;
  }
  if (o->arg[0] != CORE_PROTOCOL) {
    core_no(c, VERB_WHO, WORD_VERSION);
    core_put_u32(c, CORE_PROTOCOL);
    (void)core_put_send(c);
    return;
  }
  c->intro = INTRO_HELLO;
}

static uint8_t send_hello(struct core *c) {
  const CORE_FLASH struct core_board *b = c->board;
  core_put_line(c, WORD_HELLO);
  core_put_u32(c, CORE_PROTOCOL);
  core_put_space(c);
  core_put_flash(c, b->firmware);
  core_put_space(c);
  core_put_flash(c, b->serial);
  core_put_u32(c, c->boot);
  core_put_u32(c, b->tick_us);
  core_put_u32(c, b->absolute);
  core_put_h32(c, c->curve_crc);
  core_put_u32(c, b->term_min);
  core_put_u32(c, b->term_max);
  core_put_u32(c, b->fall_ms);
  core_put_u32(c, b->rate_perS);
  core_put_space(c);
  core_put_flash(c, b->caps);
  core_put_u32(c, b->channel_count);
  c->manifest_crc = CORE_CRC32_START;
  return core_put_send(c);
}

static void put_scale(struct core *c, uint16_t mantissa, int8_t exponent) {
  core_put_u32(c, mantissa);
  core_put_char(c, 'e');
  uint8_t size = (uint8_t)(exponent < 0 ? -exponent : exponent);
  if (exponent < 0) core_put_char(c, '-');
  if (size >= 10u) core_put_char(c, '1');
  core_put_char(c, (char)('0' + (char)(size % 10u)));
}

static uint8_t send_channel(struct core *c, uint8_t i) {
  const CORE_FLASH struct core_channel *ch = &c->board->channels[i];
  core_put_line(c, WORD_CHANNEL);
  core_put_u32(c, i);
  core_put_space(c);
  core_put_flash(c, ch->name);
  core_put_space(c);
  core_put_flash(c, ch->unit);
  put_scale(c, ch->mantissa, ch->exponent);
  core_put_i32(c, ch->min);
  core_put_i32(c, ch->max);
  core_put_u32(c, ch->group);
  uint32_t crc = c->manifest_crc;
  for (uint8_t at = 0; at < c->line_length; at++) crc = core_crc32_add(crc, c->line[at]);
  crc = core_crc32_add(crc, 0x0Au);
  if (!core_put_send(c)) return 0;
  c->manifest_crc = crc;
  return 1;
}

static uint8_t send_end(struct core *c) {
  core_put_line(c, WORD_END);
  core_put_u32(c, c->board->channel_count);
  core_put_h32(c, CORE_CRC32_END(c->manifest_crc));
  return core_put_send(c);
}

/** Sends the next lines of an introduction, as far as there is room. */
void core_introduce_pass(struct core *c) {
  for (uint8_t n = 0; n < LINES_PER_PASS && c->intro != 0u; n++) {
    if (c->port->send(c->port->ctx, c->line, 0) < CORE_LINE_MAX + 2u) return;
    uint8_t last = (uint8_t)(c->board->channel_count + INTRO_CHANNELS);
    uint8_t sent = 0;
    if (c->intro == INTRO_HELLO) {
      sent = send_hello(c);
    } else if (c->intro < last) {
      sent = send_channel(c, (uint8_t)(c->intro - INTRO_CHANNELS));
    } else {
      sent = send_end(c);
    }
    if (!sent) return;
    c->intro = (uint8_t)(c->intro == last ? 0u : c->intro + 1u);
  }
}
