/* A whole board in memory for the native tests: clock, plant, wire, non-volatile memory with faults. */
#ifndef BEAMSITTER_TEST_BENCH_H
#define BEAMSITTER_TEST_BENCH_H

#include "core.h"

#define BENCH_SENT 400000u
#define BENCH_RECORD 400000u
#define CASE_COLD 8191 /* 25 degC */

struct bench {
  struct core core;
  struct core_board board;
  struct core_port port;

  uint32_t tick;
  int32_t values[9];
  uint8_t key, loop, fan, hand;
  uint8_t converter;  /* 0: it has stopped */
  uint16_t reading_ticks;
  int32_t stray;      /* counts of current added to what the drive means */
  uint32_t noise;     /* of the jitter */

  uint16_t drive;
  uint8_t held, enabled, lit;
  uint8_t key_opens_in_drive; /* an interrupt finds the key open just before set_drive */
  uint32_t light_ticks;  /* with a drive above zero, so far */
  uint32_t unheld_light; /* of these, without a permit of ours that still runs: must stay 0 */
  uint32_t end_tick;     /* when the last permit we sent runs out, by our own sum */
  uint8_t permitted;

  uint8_t nv[CORE_NV_BYTES];
  uint16_t nv_busy_passes; /* how long a write takes */
  uint16_t nv_busy;
  int32_t nv_cut_after; /* writes until power fails in the middle of one; below zero: never */
  uint8_t nv_torn;      /* what the write that fails leaves */
  uint8_t nv_broken;    /* reads fail */
  uint8_t powerless;
  uint32_t light_at_cut; /* light_ticks when power failed */
  uint32_t nv_writes;

  char sent[BENCH_SENT];
  uint32_t sent_length;
  uint32_t mark; /* where the newest request's answers start */
  uint16_t room; /* of the send queue; 0: endless */

  uint8_t record[BENCH_RECORD]; /* every byte given to the board, and when */
  uint32_t record_tick[BENCH_RECORD];
  uint32_t record_length;

  uint32_t session;
  uint32_t number; /* of the last offer */
  uint32_t permit_n;
};

/** A fresh board with erased memory, its inputs closed and its case at 25 degC; not started. */
void bench_make(struct bench *b);
/** Starts the core and lets 600 ms pass, so that key and loop count as closed. */
void bench_boot(struct bench *b, uint8_t reset_kind);
/** One tick of 1 ms: inputs, conversion, reading when due, pass. */
void bench_tick(struct bench *b);
void bench_run(struct bench *b, uint32_t ticks);
/** Raw bytes to the board. */
void bench_bytes(struct bench *b, const void *bytes, uint32_t length);
/** A body such as ">who 1", closed with checksum and line end; then one tick. */
void bench_line(struct bench *b, const char *format, ...);
/** Whether a line that starts so was sent since the last bench_line. */
uint8_t bench_heard(const struct bench *b, const char *start);
/** The last sample line sent, its fields after the verb; 0 if there is none. */
uint8_t bench_sample(const struct bench *b, uint32_t *seq, uint32_t *status, uint32_t *cause);
/** A flat curve of `y` counts over all of the case's range. */
void bench_curve(struct bench *b, uint16_t y);
/** Curve, ask, answer: 1 when armed. */
uint8_t bench_arm(struct bench *b);
uint32_t bench_answer(const struct bench *b);
/** A permit for the newest sample. */
void bench_permit(struct bench *b, uint16_t cap, uint16_t aim, uint16_t term);
/** Runs with a permit every 100 ms. */
void bench_hold(struct bench *b, uint32_t ticks, uint16_t cap, uint16_t aim, uint16_t term);
/** Armed and lit at 1000 counts. */
uint8_t bench_light(struct bench *b);

/* main.c */
void check(uint8_t fact, const char *text, const char *file, int line);
#define CHECK(fact) check((uint8_t)((fact) ? 1 : 0), #fact, __FILE__, __LINE__)

#endif
