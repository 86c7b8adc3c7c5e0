/*
 * The built-in bench's board: fixed facts of "north", and the core's port over plain memory.
 *
 * The module imports nothing. The host writes received bytes and readings into `io`, calls, and
 * reads back what was sent. One instance is one board; its non-volatile memory is `nv`.
 */
#include "../c/core.h"

#define EXPORT(name) __attribute__((export_name(#name))) extern
#define SENT_BYTES 4096u
#define CHANNELS 9u
#define PASSES_MAX 24u /* at one tick: a main loop that is fast against the line */

static const struct core_channel channels[CHANNELS] = {
    {"set", "mA", 5, -1, 0, 5000, 0},
    {"current", "mA", 16, -2, 0, 16383, 0},
    {"case", "adc", 1, 0, 0, 16383, 0},
    {"photodiode", "adc", 1, 0, 0, 16383, 0},
    {"forward", "V", 2, -4, 0, 16383, 1},
    {"sink", "adc", 1, 0, 0, 16383, 1},
    {"ambient", "adc", 1, 0, 0, 16383, 1},
    {"fan", "rpm", 1, 0, 0, 8000, 1},
    {"supply", "V", 5, -4, 0, 16383, 1},
};

/*
 * Case counts: 14-bit ratiometric, an NTC of 10 kohm at 25 degC and B 3950 to ground under 10 kohm
 * to the supply, so 16383 * r / (r + 1) with r = exp(3950 * (1/T - 1/298.15 K)). Over: 50 degC,
 * r = 0.3588, 4326 counts. Open: colder than -40 degC, r = 40, 15985. Short: hotter than 125 degC,
 * r = 0.036, 569.
 */
static struct core_board board = {
    .firmware = "bs-north-1",
    .serial = "NORTH-1",
    .caps = "hand,toggle,inject",
    .tick_us = 1000,
    .absolute = 4400,
    .term_min = 150,
    .term_max = 10000,
    .fall_ms = 20,
    .rate_perS = 50,
    .channels = channels,
    .channel_count = CHANNELS,
    .anchor_every = 1,
    .set = 0,
    .current = 1,
    .case_ = 2,
    .supply = 8,
    .current_num = 25, /* 0.5 mA over 0.16 mA */
    .current_den = 8,
    .current_step = 4,
    .case_warm_is_low = 1,
    .case_over = 4326,
    .case_open = 15985,
    .case_short = 569,
    .case_fault_ms = 100,
    .supply_low = 9000, /* 4.5 V and 5.5 V */
    .supply_high = 11000,
    .supply_ms = 50,
    .dark_current = 125, /* 20 mA */
    .dark_current_ms = 100,
    .follow_ms = 50,
    .converter_stop_ms = 200,
    .emission_delay_ms = 4000,
    .slew_countsPerS = 400, /* 200 mA/s */
    .inject = 1,
};

static struct core core;
static uint8_t nv[CORE_NV_BYTES];
static uint8_t sent[SENT_BYTES];
static uint16_t sent_length;
static int32_t values[CHANNELS];
static uint16_t drive;
static uint8_t held; /* cut, until a drive of zero is commanded */
static uint8_t enabled;
static uint8_t lit;
static uint32_t noise;

void *memset(void *to, int byte, unsigned long n);
void *memcpy(void *to, const void *from, unsigned long n);

void *memset(void *to, int byte, unsigned long n) {
  uint8_t *p = to;
  for (unsigned long i = 0; i < n; i++) p[i] = (uint8_t)byte;
  return to;
}

void *memcpy(void *to, const void *from, unsigned long n) {
  uint8_t *p = to;
  const uint8_t *q = from;
  for (unsigned long i = 0; i < n; i++) p[i] = q[i];
  return to;
}

static void set_drive(void *ctx, uint16_t counts) {
  (void)ctx;
  if (counts == 0u) held = 0;
  drive = held ? 0 : counts;
}

static void cut(void *ctx) {
  (void)ctx;
  held = 1;
  drive = 0;
  enabled = 0;
}

static void alive(void *ctx, uint8_t on) {
  (void)ctx;
  enabled = on;
}

static void indicator(void *ctx, uint8_t on) {
  (void)ctx;
  lit = on;
}

static uint16_t send(void *ctx, const uint8_t *bytes, uint16_t length) {
  (void)ctx;
  uint16_t room = (uint16_t)(SENT_BYTES - sent_length);
  if (length == 0u) return room;
  if (length > room) return 0;
  memcpy(sent + sent_length, bytes, length);
  sent_length = (uint16_t)(sent_length + length);
  return length;
}

static int16_t nv_read(void *ctx, uint16_t address) {
  (void)ctx;
  return address < CORE_NV_BYTES ? (int16_t)nv[address] : (int16_t)-2;
}

static uint8_t nv_write(void *ctx, uint16_t address, uint8_t byte) {
  (void)ctx;
  if (address < CORE_NV_BYTES) nv[address] = byte;
  return 0;
}

/* Xorshift from the seed given: the same seed gives the same night. */
static uint32_t jitter(void *ctx) {
  (void)ctx;
  noise ^= noise << 13;
  noise ^= noise >> 17;
  noise ^= noise << 5;
  return noise;
}

static const struct core_port port = {0,    set_drive, cut,      alive, indicator,
                                      send, nv_read,   nv_write, jitter};

/* Before boot only: samples per second, seed of the jitter (not 0), serial through serial_at. */
EXPORT(configure) void configure(uint32_t rate_perS, uint32_t seed);
EXPORT(serial_at) void *serial_at(void);
EXPORT(nv_at) void *nv_at(void);
EXPORT(values_at) void *values_at(void);
EXPORT(sent_at) void *sent_at(void);
EXPORT(boot) void boot(uint32_t reset_kind);
EXPORT(byte) uint32_t byte(uint32_t received);
EXPORT(line_break) void line_break(void);
EXPORT(inputs) void inputs(uint32_t key, uint32_t loop, uint32_t fan, uint32_t hand);
EXPORT(conversion) void conversion(uint32_t current_counts, uint32_t tick);
EXPORT(reading) void reading(uint32_t tick);
EXPORT(pass) void pass(uint32_t tick);
EXPORT(sent_take) uint32_t sent_take(void);
EXPORT(output) uint32_t output(void);

void configure(uint32_t rate_perS, uint32_t seed) {
  board.rate_perS = (uint16_t)rate_perS;
  noise = seed == 0u ? 1u : seed;
}

void *serial_at(void) { return board.serial; }
void *nv_at(void) { return nv; }
void *values_at(void) { return values; }
void *sent_at(void) { return sent; }

void boot(uint32_t reset_kind) {
  sent_length = 0;
  core_init(&core, &board, &port, (uint8_t)reset_kind);
}

/* 0 when the ring is full: then the host keeps the byte for after the next pass, as a wire would. */
uint32_t byte(uint32_t received) {
  if ((uint8_t)(core.wire.head + 1u) == core.wire.tail) return 0;
  core_byte(&core, (uint8_t)received);
  return 1;
}

void line_break(void) { core_break(&core); }

void inputs(uint32_t key, uint32_t loop, uint32_t fan, uint32_t hand) {
  core_inputs(&core, (uint8_t)key, (uint8_t)loop, (uint8_t)fan, (uint8_t)hand);
}

void conversion(uint32_t current_counts, uint32_t tick) {
  core_conversion(&core, (uint16_t)current_counts, tick);
}

void reading(uint32_t tick) { core_reading(&core, values, tick); }

void pass(uint32_t tick) {
  core_pass(&core, tick);
  for (uint8_t i = 0; i < PASSES_MAX && (core_line_waits(&core) || core.intro != 0u); i++) {
    core_pass(&core, tick);
  }
}

/* Length of what stands at sent_at; the host copies it before it calls anything else. */
uint32_t sent_take(void) {
  uint32_t length = sent_length;
  sent_length = 0;
  return length;
}

/* Drive in counts, then enabled (bit 16) and indicator (bit 17). */
uint32_t output(void) {
  return (uint32_t)drive | ((uint32_t)enabled << 16) | ((uint32_t)lit << 17);
}
