#include "converter.h"

#include <avr/interrupt.h>
#include <avr/io.h>
#include <util/atomic.h>

#include "firmware.h"
#include "pins.h"

#define STEPS_TO_READING READING_STEP
#define REFERENCE_SUPPLY _BV(REFS0) /* dividers and pulse width follow the supply alike */
#define SLOTS 8u                    /* conversions a tick */
#define NOTHING INPUTS              /* a conversion that only drains or settles the sampler */

#if SAMPLE_TICKS * 1023 > 65535
#error "the sum of one sample no longer fits 16 bits"
#endif

struct slot {
  uint8_t mux;
  uint8_t input;
};

static const __flash struct slot fixedSlots[SLOTS - 2u] = {
    {ADC_GROUND, NOTHING},   {ADC_CURRENT, INPUT_CURRENT},
    {ADC_GROUND, NOTHING},   {ADC_CASE, INPUT_CASE},
    {ADC_GROUND, NOTHING},   {ADC_PHOTODIODE, INPUT_PHOTODIODE}};

/* The last pair takes turns from tick to tick. The band-gap has a high impedance: its first
 * conversion lets it settle. */
static const __flash struct slot turnSlots[4][2] = {
    {{ADC_BANDGAP, NOTHING}, {ADC_BANDGAP, INPUT_BANDGAP}},
    {{ADC_GROUND, NOTHING}, {ADC_FORWARD, INPUT_FORWARD}},
    {{ADC_GROUND, NOTHING}, {ADC_SINK, INPUT_SINK}},
    {{ADC_GROUND, NOTHING}, {ADC_FORWARD, INPUT_FORWARD}}};

struct sums {
  uint16_t sum[INPUTS];
  uint8_t count[INPUTS];
};

static volatile uint32_t tick;
static uint8_t slot, selected, turn, ticksInSample;
static uint16_t noise;
static struct sums running, finished;
static bool fresh;

void converter_init(void) {
  selected = NOTHING;
  ADMUX = REFERENCE_SUPPLY | ADC_GROUND;
  DIDR0 = 0x3f; /* no digital input buffers on the analogue pins */
  ADCSRA = _BV(ADEN) | _BV(ADSC) | _BV(ADPS2) | _BV(ADPS1) | _BV(ADPS0); /* 125 kHz: 104 us */
  TCCR0A = _BV(WGM01);
  OCR0A = 249; /* 2 MHz / 250 = 8 kHz */
  TIMSK0 = _BV(OCIE0A);
  TCCR0B = _BV(CS01);
}

static void take(uint16_t steps) {
  if (selected == NOTHING) return;
  noise = (uint16_t)(noise << 1 | noise >> 15) ^ steps;
  if (running.count[selected] < SAMPLE_TICKS) {
    running.sum[selected] += steps;
    running.count[selected]++;
  }
  if (selected == INPUT_CURRENT) core_conversion(&core, steps * STEPS_TO_READING, tick);
}

static void endTick(void) {
  tick++;
  turn = (turn + 1u) & 3u;
  if (++ticksInSample < SAMPLE_TICKS) return;
  ticksInSample = 0;
  finished = running;
  running = (struct sums){{0}, {0}};
  fresh = true;
}

/* Takes the conversion started 125 us ago and starts the next: their rhythm is the timer's. A
 * converter that has stopped is not waited for: nothing is taken, and the core sees it stand. */
ISR(TIMER0_COMPA_vect) {
  if (!(ADCSRA & _BV(ADSC))) take(ADC);
  if (++slot == SLOTS) {
    slot = 0;
    endTick();
  }
  const __flash struct slot *next =
      slot < SLOTS - 2u ? &fixedSlots[slot] : &turnSlots[turn][slot - (SLOTS - 2u)];
  selected = next->input;
  ADMUX = REFERENCE_SUPPLY | next->mux;
  ADCSRA |= _BV(ADSC);
}

uint32_t converter_tick(void) {
  uint32_t now;
  ATOMIC_BLOCK(ATOMIC_RESTORESTATE) { now = tick; }
  return now;
}

uint16_t converter_noise(void) {
  uint16_t now;
  ATOMIC_BLOCK(ATOMIC_RESTORESTATE) { now = noise; }
  return now;
}

static uint16_t average(uint16_t sum, uint8_t count) {
  if (count == 0) return 0;
  return (uint16_t)(((uint32_t)sum * STEPS_TO_READING + count / 2u) / count);
}

bool converter_sample(int32_t reading[INPUTS], uint32_t *at) {
  struct sums sums;
  bool whole;
  ATOMIC_BLOCK(ATOMIC_RESTORESTATE) {
    whole = fresh;
    fresh = false;
    sums = finished;
    *at = tick - ticksInSample; /* when it was finished */
  }
  if (!whole) return false;
  for (uint8_t n = 0; n < INPUTS; n++) reading[n] = average(sums.sum[n], sums.count[n]);
  return true;
}
