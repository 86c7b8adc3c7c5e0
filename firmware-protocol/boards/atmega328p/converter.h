/*
 * The converter and the tick. Timer 0 starts one conversion every 125 us; eight make a tick of
 * 1 ms; ticks of whole mains periods make a sample. Between two outside inputs the converter looks
 * at ground, so that an input whose wire is off cannot show the input before it.
 *
 * Readings are in sixteenths of a converter step, 0 … 16368, averaged over the sample.
 */
#ifndef BOARD_CONVERTER_H
#define BOARD_CONVERTER_H

#include <stdbool.h>
#include <stdint.h>

#define TICK_US 1000u

/* One sample is one mains period of 50 Hz, or three of 60 Hz (20 ms and 50 ms: whole ticks). */
#ifndef MAINS_HZ
#define MAINS_HZ 50
#endif
#if MAINS_HZ == 50
#define SAMPLE_TICKS 20u
#elif MAINS_HZ == 60
#define SAMPLE_TICKS 50u
#else
#error "MAINS_HZ is 50 or 60"
#endif
#define SAMPLES_A_SECOND (1000u / SAMPLE_TICKS)

#define READING_STEP 16u  /* one step of the converter */
#define READING_MAX 16368 /* 16 × 1023 */

/* What is read, in the order in which converter_sample gives it. */
enum converter_input {
  INPUT_CURRENT,
  INPUT_CASE,
  INPUT_PHOTODIODE,
  INPUT_FORWARD,
  INPUT_BANDGAP,
  INPUT_SINK,
  INPUTS
};

void converter_init(void);

/* Ticks since boot; wraps after 49 days. */
uint32_t converter_tick(void);

/* The newest whole sample and the tick at the end of its last conversion; false, and nothing
 * written, when there was none since the last call. */
bool converter_sample(int32_t reading[INPUTS], uint32_t *at);

/* Bits that the noise of the newest conversions moves. */
uint16_t converter_noise(void);

#endif
