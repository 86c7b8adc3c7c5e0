/*
 * A host that does anything, at any time, for 200 short lives: permits for old, new and unheard-of
 * samples, darks, resets, arming, injections, keys, warm cases, resets of the board, ticks near the
 * wrap. The oracle keeps its own book: light needs a permit that we sent in this session, whose
 * sample's tick + term is still to come and whose cap is not passed. (Seed 20261201.)
 */
#include <stdio.h>
#include <string.h>

#include "bench.h"

#define BOOK 4096u

static uint32_t seed;

static uint32_t any(uint32_t below) {
  seed = seed * 1664525u + 1013904223u;
  return (uint32_t)(((uint64_t)seed * below) >> 32);
}

/* What the oracle knows. */
static struct {
  uint32_t sample_tick[256]; /* by the low byte of its number */
  uint32_t end[BOOK];
  uint16_t cap[BOOK];
  uint32_t permits;
  uint32_t lit;
} book;

static void expect_held(struct bench *b) {
  book.sample_tick[b->core.seq & 255u] = b->tick - b->tick % b->reading_ticks;
  if (b->drive == 0) return;
  book.lit++;
  uint8_t held = 0;
  for (uint32_t i = 0; i < book.permits && !held; i++) {
    held = (int32_t)(book.end[i] - b->tick) > 0 && book.cap[i] >= b->drive;
  }
  CHECK(held);
  CHECK(b->drive <= 4400 && b->core.state == CORE_ARMED);
}

static void run(struct bench *b, uint32_t ticks) {
  for (uint32_t i = 0; i < ticks; i++) {
    bench_tick(b);
    expect_held(b);
  }
}

static void permit(struct bench *b) {
  uint32_t back = any(10) == 0 ? any(80) : any(3);
  uint32_t n = b->core.seq - back;
  uint16_t cap = (uint16_t)any(4500), aim = (uint16_t)any(cap + 1u);
  uint16_t term = (uint16_t)(100 + any(900));
  if (book.permits < BOOK) {
    book.end[book.permits] = book.sample_tick[n & 255u] + term;
    book.cap[book.permits++] = cap;
  }
  bench_line(b, ">permit %08X %u %u %u %u", (unsigned)b->session, (unsigned)n, (unsigned)cap,
             (unsigned)aim, (unsigned)term);
  expect_held(b);
}

static void arm(struct bench *b) {
  if (bench_arm(b)) book.permits = 0;
}

static void rare(struct bench *b) {
  switch (any(9)) {
    case 0: bench_line(b, ">dark %u", any(2) ? 0u : 64u); break;
    case 1: bench_bytes(b, "dark\n", 5); break;
    case 2: bench_bytes(b, "\x18\x18\x18", 3); break;
    case 3: bench_line(b, ">who 1"); break;
    case 4: b->key = (uint8_t)any(2); break;
    case 5: b->values[2] = (int32_t)(4000 + any(9000)); break;
    case 6: b->stray = any(3) ? 0 : (int32_t)any(400); break;
    case 7: run(b, any(1500)); break;
    default:
      if (any(4) == 0) bench_boot(b, (uint8_t)any(5));
      break;
  }
}

/* What a host does to get lit again. */
static void tidy(struct bench *b) {
  b->key = 1;
  b->stray = 0;
  b->values[2] = CASE_COLD;
  run(b, 600);
  bench_line(b, ">reset %u", b->core.cause);
  arm(b);
}

void test_random_sessions(struct bench *b) {
  seed = 20261201;
  memset(&book, 0, sizeof book);
  for (uint32_t life = 0; life < 200; life++) {
    bench_make(b);
    memset(book.sample_tick, 0, sizeof book.sample_tick);
    b->tick = any(2) ? any(0xFFFFFFFFu) : 0xFFFFFFFFu - any(8000);
    b->noise = any(0xFFFFFFFFu);
    bench_boot(b, CORE_POWER);
    for (uint32_t deed = 0; deed < 150; deed++) {
      if (b->core.state != CORE_ARMED) tidy(b);
      if (any(60) == 0) rare(b);
      else permit(b);
      run(b, 20 + any(100));
      b->sent_length = b->mark = 0;
    }
    b->record_length = 0;
  }
  CHECK(book.lit > 100000); /* or the oracle watched nothing */
}
