/*
 * Firmware for an ATmega328P at 16 MHz. Everything that decides is in the core (../../c); this is
 * the core's port: README.md draws the wiring, pins.h and facts.h have the numbers.
 */
#include <avr/interrupt.h>
#include <avr/io.h>
#include <avr/sleep.h>
#include <avr/wdt.h>
#include <util/atomic.h>

#include "converter.h"
#include "drive.h"
#include "facts.h"
#include "firmware.h"
#include "memory.h"
#include "pins.h"
#include "serial.h"
#include "start.h"

#if TICK_US != 1000
#error "the facts count terms in ticks of one millisecond"
#endif

/* Behind the first come the converter's inputs, in its own order. */
enum channel { SET, CURRENT, CASE, PHOTODIODE, FORWARD, SUPPLY, SINK, CHANNELS };

_Static_assert(SUPPLY == 1 + INPUT_BANDGAP && CHANNELS == 1 + INPUTS, "channels follow inputs");

static const __flash struct core_channel channels[CHANNELS] = {
    {"set", "mA", 2, 0, 0, DRIVE_MAX, 0},
    {"current", "mA", 15259, -5, 0, READING_MAX, 0},
    {"case", "adc", 1, 0, 0, READING_MAX, 0},
    {"photodiode", "mV", 30518, -5, 0, READING_MAX, 0},
    {"forward", "mV", 30518, -5, 0, READING_MAX, 1},
    {"supply", "mV", 1, 0, 0, 65535, 1},
    {"sink", "adc", 1, 0, 0, READING_MAX, 2},
};

static const __flash struct core_board board = {
    .firmware = "bs-atmega328p-1",
    .serial = BOARD_SERIAL,
    .caps = "hand,toggle,inject",
    .tick_us = TICK_US,
    .absolute = ABSOLUTE_COUNTS,
    .term_min = TERM_MIN_MS,
    .term_max = TERM_MAX_MS,
    .fall_ms = FALL_MS,
    .rate_perS = SAMPLES_A_SECOND,
    .channels = channels,
    .channel_count = CHANNELS,
    .anchor_every = 1, /* 64 anchors are 1.3 s: a permit that comes later is too old anyway */
    .set = SET,
    .current = CURRENT,
    .case_ = CASE,
    .supply = SUPPLY,
    .current_num = CURRENT_NUM,
    .current_den = CURRENT_DEN,
    .current_step = READING_STEP,
    .case_warm_is_low = 1,
    .case_over = CASE_OVER_COUNTS,
    .case_open = CASE_OPEN_COUNTS,
    .case_short = CASE_SHORT_COUNTS,
    .case_fault_ms = CASE_FAULT_MS,
    .supply_low = SUPPLY_LOW_MV,
    .supply_high = SUPPLY_HIGH_MV,
    .supply_ms = 50,
    .dark_current = DARK_CURRENT_COUNTS,
    .dark_current_ms = 100,
    .follow_ms = 50,
    .converter_stop_ms = 100,
    .emission_delay_ms = 4000,
    .slew_countsPerS = SLEW_COUNTS_PER_S,
    .inject = 1,
};

struct core core;
/* Loss of power sets other flags beside its own, so it is asked first. A boot loader may clear all
 * of them. */
static uint8_t resetKind(void) {
  if (start_flags & _BV(PORF)) return CORE_POWER;
  if (start_flags & _BV(WDRF)) return CORE_WATCHDOG;
  if (start_flags & _BV(BORF)) return CORE_BROWN_OUT;
  if (start_flags & _BV(EXTRF)) return CORE_EXTERNAL;
  return CORE_UNKNOWN;
}

static void portSetDrive(void *ctx, uint16_t counts) {
  (void)ctx;
  drive_set(counts);
}

static void portCut(void *ctx) {
  (void)ctx;
  drive_cut();
}

static void portAlive(void *ctx, uint8_t enabled) {
  (void)ctx;
  wdt_reset();
  drive_enable(enabled);
}

static void portIndicator(void *ctx, uint8_t on) {
  (void)ctx;
  drive_indicate(on);
}

static uint16_t portSend(void *ctx, const uint8_t *bytes, uint16_t length) {
  (void)ctx;
  return serial_send(bytes, length);
}

static int16_t portRead(void *ctx, uint16_t address) {
  (void)ctx;
  return memory_read(address);
}

static uint8_t portWrite(void *ctx, uint16_t address, uint8_t byte) {
  (void)ctx;
  return memory_write(address, byte);
}

static uint32_t portJitter(void *ctx) {
  (void)ctx;
  uint16_t timer;
  ATOMIC_BLOCK(ATOMIC_RESTORESTATE) { timer = TCNT1; }
  return (uint32_t)converter_noise() << 16 | (uint16_t)(timer << 6) | TCNT0;
}

static const struct core_port port = {
    .ctx = 0,
    .set_drive = portSetDrive,
    .cut = portCut,
    .alive = portAlive,
    .indicator = portIndicator,
    .send = portSend,
    .nv_read = portRead,
    .nv_write = portWrite,
    .jitter = portJitter,
};

static void readInputs(void) {
  const uint8_t low = (uint8_t)~PIND;
  core_inputs(&core, (low >> PIN_KEY) & 1u, (low >> PIN_LOOP) & 1u, 1,
              (low >> PIN_BUTTON) & 1u);
}

/* The supply from the band-gap read against it: one reference never judges itself. */
static int32_t supply_mV(int32_t bandgap) {
  if (bandgap <= 0) return 0;
  const uint32_t mV = (uint32_t)BANDGAP_MV * 16384u / (uint16_t)bandgap;
  return mV > 65535u ? 65535 : (int32_t)mV;
}

/* Apart from main, so that its locals are off the stack during a pass. */
static __attribute__((noinline)) void giveReadings(void) {
  int32_t values[CHANNELS];
  uint32_t tick;
  if (!converter_sample(&values[CURRENT], &tick)) return;
  values[SET] = 0; /* the core puts its drive here */
  values[SUPPLY] = supply_mV(values[SUPPLY]);
  core_reading(&core, values, tick);
}

/* Inputs with pull-ups; pins that lead nowhere too, so that none floats. */
static void initInputs(void) {
  PORTD |= _BV(PIN_KEY) | _BV(PIN_LOOP) | _BV(PIN_BUTTON) | _BV(2) | _BV(3);
  PORTB |= _BV(2) | _BV(3) | _BV(4) | _BV(5);
}

int main(void) {
  drive_init();
  initInputs();
  core_init(&core, &board, &port, resetKind());
  serial_init();
  converter_init();
  sei();
  set_sleep_mode(SLEEP_MODE_IDLE);
  for (;;) {
    const uint32_t tick = converter_tick();
    readInputs();
    giveReadings();
    core_pass(&core, tick);
    /* One pass a tick, and more while lines wait. Interrupts go on, 125 us apart at most. */
    while (converter_tick() == tick && !core_line_waits(&core)) sleep_mode();
  }
}
