/* Start, and one whole pass of the main loop. */
#include "parts.h"

#define SECOND_MS 1000u

static void clear(struct core *c) {
  uint8_t *byte = (uint8_t *)c;
  for (uint16_t i = 0; i < sizeof *c; i++) byte[i] = 0;
}

/* A table that breaks these is a wrong board; it starts latched as a defect. */
static uint8_t board_sane(const CORE_FLASH struct core_board *b) {
  return (uint8_t)(b->tick_us >= 100u && b->tick_us <= 10000u && b->channel_count >= 1u &&
                   b->channel_count <= 64u && b->anchor_every >= 1u && b->rate_perS >= 1u &&
                   b->current_den >= 1u && b->current_step >= 1u && b->term_min >= 1u && b->term_min <= b->term_max &&
                   b->term_max <= 32767u && b->slew_countsPerS <= 40000u);
}

void core_init(struct core *c, const CORE_FLASH struct core_board *board,
               const struct core_port *port, uint8_t reset_kind) {
  clear(c);
  c->board = board;
  c->port = port;
  port->cut(port->ctx);
  port->set_drive(port->ctx, 0);
  port->indicator(port->ctx, 0);
  core_memory_start(c, reset_kind);
  CORE_ASSERT(c, board_sane(board));
  core_send_boot(c, reset_kind);
}

static void first_pass(struct core *c) {
  c->started = 1;
  c->uptime_tick = c->tick;
  c->slew_tick = c->tick;
  c->ceilings.tick = c->tick;
  c->drives.tick = c->tick;
}

static void count_uptime(struct core *c) {
  uint32_t second = core_ticks(c, SECOND_MS);
  if (c->tick - c->uptime_tick < second) return;
  c->uptime_tick += second;
  c->uptime_s++;
}

static void indicate(struct core *c) {
  uint8_t on = (uint8_t)(c->state == CORE_ARMED);
  if (on == c->indicator) return;
  c->indicator = on;
  c->port->indicator(c->port->ctx, on);
}

void core_pass(struct core *c, uint32_t tick) {
  c->tick = tick;
  if (!c->started) first_pass(c);
  count_uptime(c);
  core_guard_pass(c);
  core_inject_pass(c);
  core_inputs_pass(c);
  core_expiry_pass(c); /* before the line: what has expired is erased, not renewed */
  if (core_line_take(c)) core_obey_line(c);
  core_memory_pass(c);
  core_offer_pass(c);
  core_introduce_pass(c);
  core_curve_pass(c);
  core_drive_pass(c);
  indicate(c);
  /* An interrupt may have cut since: then the enable must not be toggled again. */
  uint8_t enabled = (uint8_t)(c->drive > 0u && !c->wire.dark && c->wire.cause == 0u);
  c->port->alive(c->port->ctx, enabled);
}
