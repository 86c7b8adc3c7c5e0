#include "bench.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const struct core_channel channels[9] = {
    {"set", "mA", 5, -1, 0, 5000, 0},         {"current", "mA", 16, -2, 0, 16383, 0},
    {"case", "adc", 1, 0, 0, 16383, 0},       {"photodiode", "adc", 1, 0, -100, 16383, 0},
    {"forward", "V", 2, -4, 0, 16383, 1},     {"sink", "adc", 1, 0, 0, 16383, 1},
    {"ambient", "adc", 1, 0, 0, 16383, 2},    {"fan", "rpm", 1, 0, 0, 8000, 2},
    {"supply", "V", 5, -4, 0, 16383, 1},
};

static void set_drive(void *ctx, uint16_t counts) {
  struct bench *b = ctx;
  if (b->key_opens_in_drive) core_inputs(&b->core, 0, 1, 1, 0);
  if (counts == 0) b->held = 0;
  b->drive = b->held ? 0 : counts;
}

static void cut(void *ctx) {
  struct bench *b = ctx;
  b->held = 1;
  b->drive = 0;
}

static void alive(void *ctx, uint8_t enabled) {
  ((struct bench *)ctx)->enabled = enabled;
}

static void indicator(void *ctx, uint8_t on) {
  ((struct bench *)ctx)->lit = on;
}

static uint16_t send(void *ctx, const uint8_t *bytes, uint16_t length) {
  struct bench *b = ctx;
  uint16_t room = b->room ? b->room : 1000;
  if (length == 0) return room;
  if (length > room) return 0;
  if (b->sent_length + length >= BENCH_SENT) abort();
  memcpy(b->sent + b->sent_length, bytes, length);
  b->sent_length += length;
  b->sent[b->sent_length] = 0;
  return length;
}

static int16_t nv_read(void *ctx, uint16_t address) {
  struct bench *b = ctx;
  if (address >= CORE_NV_BYTES) abort();
  if (b->nv_broken) return -2;
  return b->nv_busy ? (int16_t)-1 : (int16_t)b->nv[address];
}

static uint8_t nv_write(void *ctx, uint16_t address, uint8_t byte) {
  struct bench *b = ctx;
  if (address >= CORE_NV_BYTES) abort();
  if (b->nv_busy) return 1;
  b->nv_writes++;
  b->nv_busy = b->nv_busy_passes;
  if (b->powerless) return 0;
  if (b->nv_cut_after == 0) {
    b->nv[address] = b->nv_torn;
    b->powerless = 1;
    b->light_at_cut = b->light_ticks;
    return 0;
  }
  if (b->nv_cut_after > 0) b->nv_cut_after--;
  b->nv[address] = byte;
  return 0;
}

static uint32_t jitter(void *ctx) {
  struct bench *b = ctx;
  b->noise = b->noise * 1664525u + 1013904223u;
  return b->noise;
}

void bench_make(struct bench *b) {
  memset(b, 0, sizeof *b);
  const struct core_board board = {
      .firmware = "bs-test-1", .serial = "TEST-1", .caps = "hand,toggle,inject",
      .tick_us = 1000, .absolute = 4400, .term_min = 150, .term_max = 10000, .fall_ms = 20,
      .rate_perS = 50, .channels = channels, .channel_count = 9, .anchor_every = 1,
      .set = 0, .current = 1, .case_ = 2, .supply = 8, .current_num = 25, .current_den = 8, .current_step = 1,
      .case_warm_is_low = 1, .case_over = 4326, .case_open = 15985, .case_short = 569,
      .case_fault_ms = 100, .supply_low = 9000, .supply_high = 11000, .supply_ms = 50,
      .dark_current = 125, .dark_current_ms = 100, .follow_ms = 50, .converter_stop_ms = 200,
      .emission_delay_ms = 4000, .slew_countsPerS = 4000, .inject = 1};
  b->board = board;
  const struct core_port port = {b,    set_drive, cut,      alive, indicator,
                                 send, nv_read,   nv_write, jitter};
  b->port = port;
  memset(b->nv, 0xFF, sizeof b->nv);
  b->nv_cut_after = -1;
  b->key = b->loop = b->fan = 1;
  b->converter = 1;
  b->reading_ticks = 20;
  b->values[2] = CASE_COLD;
  b->values[8] = 10000;
}

void bench_boot(struct bench *b, uint8_t reset_kind) {
  b->powerless = 0;
  b->nv_busy = 0;
  b->drive = 0;
  b->permitted = 0;
  core_init(&b->core, &b->board, &b->port, reset_kind);
  bench_run(b, 600);
}

/* What flows: the drive's meaning at once, plus what a test lets stray. */
static uint16_t current_of(const struct bench *b) {
  int32_t counts = (int32_t)b->drive * 25 / 8 + b->stray;
  return (uint16_t)(counts < 0 ? 0 : counts);
}

static void watch_light(struct bench *b) {
  if (b->drive == 0) return;
  b->light_ticks++;
  if (!b->permitted || (int32_t)(b->end_tick - b->tick) <= 0) b->unheld_light++;
}

void bench_tick(struct bench *b) {
  b->tick++;
  if (b->nv_busy) b->nv_busy--;
  core_inputs(&b->core, b->key, b->loop, b->fan, b->hand);
  if (b->converter) {
    b->values[1] = current_of(b);
    core_conversion(&b->core, current_of(b), b->tick);
    if (b->tick % b->reading_ticks == 0) core_reading(&b->core, b->values, b->tick);
  }
  core_pass(&b->core, b->tick);
  watch_light(b);
}

void bench_run(struct bench *b, uint32_t ticks) {
  for (uint32_t i = 0; i < ticks; i++) bench_tick(b);
}

void bench_bytes(struct bench *b, const void *bytes, uint32_t length) {
  const uint8_t *p = bytes;
  for (uint32_t i = 0; i < length; i++) {
    if (b->record_length < BENCH_RECORD) {
      b->record[b->record_length] = p[i];
      b->record_tick[b->record_length++] = b->tick;
    }
    core_byte(&b->core, p[i]);
  }
}

/* A checksum of the tests' own, bit by bit from its definition. */
static uint16_t crc16(const char *text) {
  uint32_t crc = 0xFFFF;
  for (; *text; text++) {
    crc ^= (uint32_t)(uint8_t)*text << 8;
    for (int i = 0; i < 8; i++) crc = (crc & 0x8000 ? (crc << 1) ^ 0x1021 : crc << 1) & 0xFFFF;
  }
  return (uint16_t)crc;
}

static uint32_t crc32(const void *bytes, uint32_t length) {
  const uint8_t *p = bytes;
  uint32_t crc = 0xFFFFFFFF;
  for (uint32_t i = 0; i < length; i++) {
    crc ^= p[i];
    for (int k = 0; k < 8; k++) crc = crc & 1 ? (crc >> 1) ^ 0xEDB88320 : crc >> 1;
  }
  return crc ^ 0xFFFFFFFF;
}

void bench_line(struct bench *b, const char *format, ...) {
  char body[200], line[220];
  va_list args;
  va_start(args, format);
  vsnprintf(body, sizeof body, format, args);
  va_end(args);
  int n = snprintf(line, sizeof line, "%s %04X\n", body, (unsigned)crc16(body));
  b->mark = b->sent_length;
  bench_bytes(b, line, (uint32_t)n);
  bench_tick(b);
}

uint8_t bench_heard(const struct bench *b, const char *start) {
  for (const char *line = b->sent + b->mark; *line; line = strchr(line, '\n') + 1) {
    if (strncmp(line, start, strlen(start)) == 0) return 1;
  }
  return 0;
}

uint8_t bench_sample(const struct bench *b, uint32_t *seq, uint32_t *status, uint32_t *cause) {
  const char *last = 0;
  uint32_t from = b->sent_length > 2000 ? b->sent_length - 2000 : 0;
  for (const char *p = b->sent + from; (p = strstr(p, "<sample ")) != 0; p++) last = p;
  if (last == 0) return 0;
  unsigned s = 0, t = 0, st = 0, ca = 0;
  if (sscanf(last, "<sample %u %u %x %u", &s, &t, &st, &ca) != 4) return 0;
  *seq = s;
  *status = st;
  *cause = ca;
  return 1;
}

void bench_curve(struct bench *b, uint16_t y) {
  uint8_t bytes[8] = {0, 0, (uint8_t)y, (uint8_t)(y >> 8), 0xFF, 0x3F, (uint8_t)y, (uint8_t)(y >> 8)};
  bench_line(b, ">stage 2");
  bench_line(b, ">point 0 0 %u", (unsigned)y);
  bench_line(b, ">point 1 16383 %u", (unsigned)y);
  bench_line(b, ">commit %08X", (unsigned)crc32(bytes, 8));
}

uint32_t bench_answer(const struct bench *b) {
  char text[160];
  const struct core *c = &b->core;
  int n = snprintf(text, sizeof text, "%08X %u %u %08X %u %u %u 1 %s", (unsigned)b->number,
                   (unsigned)c->boot, (unsigned)c->arms, (unsigned)c->curve_crc,
                   (unsigned)b->board.absolute, (unsigned)b->board.term_min,
                   (unsigned)b->board.term_max, b->board.firmware);
  return crc32(text, (uint32_t)n);
}

uint8_t bench_arm(struct bench *b) {
  if (b->core.curve_crc == 0) bench_curve(b, 4400);
  bench_line(b, ">ask arm");
  bench_run(b, 40);
  const char *offer = strstr(b->sent + b->mark, "<offer arm ");
  unsigned number = 0, session = 0;
  if (offer == 0 || sscanf(offer, "<offer arm %x", &number) != 1) return 0;
  b->number = number;
  bench_line(b, ">arm %08X", (unsigned)bench_answer(b));
  const char *yes = strstr(b->sent + b->mark, "<yes arm ");
  if (yes == 0 || sscanf(yes, "<yes arm %x", &session) != 1) return 0;
  b->session = session;
  return b->core.state == CORE_ARMED;
}

void bench_permit(struct bench *b, uint16_t cap, uint16_t aim, uint16_t term) {
  b->permit_n = b->core.seq;
  /* Readings come on round ticks: the newest one's tick by our own sum. */
  uint32_t end = b->tick - b->tick % b->reading_ticks + term;
  if (!b->permitted || (int32_t)(end - b->end_tick) > 0) b->end_tick = end;
  b->permitted = 1;
  bench_line(b, ">permit %08X %u %u %u %u", (unsigned)b->session, (unsigned)b->permit_n,
             (unsigned)cap, (unsigned)aim, (unsigned)term);
}

void bench_hold(struct bench *b, uint32_t ticks, uint16_t cap, uint16_t aim, uint16_t term) {
  for (uint32_t i = 0; i < ticks; i += 100) {
    bench_permit(b, cap, aim, term);
    bench_run(b, 99);
  }
}

uint8_t bench_light(struct bench *b) {
  if (!bench_arm(b)) return 0;
  bench_hold(b, 5000, 1200, 1000, 500);
  return b->drive == 1000;
}
