/*
 * Non-volatile memory: boots, and power that fails in the middle of every single write, leaving
 * whatever byte. And a whole session replayed.
 */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "bench.h"

static const uint8_t torn_values[] = {0x00, 0xFF, 0xA5, 0x3C, 0x5A, 0xC3, 0x02, 0x71};

void test_boots(struct bench *b) {
  static const struct {
    uint8_t kind, cause;
    const char *line;
  } kinds[] = {{CORE_POWER, 5, "<boot bs-test-1 power "},
               {CORE_BROWN_OUT, 7, "<boot bs-test-1 brown-out "},
               {CORE_WATCHDOG, 6, "<boot bs-test-1 watchdog "},
               {CORE_EXTERNAL, 5, "<boot bs-test-1 external "},
               {CORE_UNKNOWN, 5, "<boot bs-test-1 unknown "}};
  for (unsigned i = 0; i < 5; i++) {
    bench_make(b);
    bench_boot(b, CORE_POWER);
    CHECK(b->core.state == CORE_STANDBY);
    CHECK(bench_light(b));
    b->mark = b->sent_length;
    bench_boot(b, kinds[i].kind);
    CHECK(bench_heard(b, kinds[i].line));
    CHECK(b->drive == 0 && b->core.state == CORE_TRIPPED && b->core.cause == kinds[i].cause);
    bench_boot(b, CORE_POWER); /* the latch outlives another reset, with its cause */
    CHECK(b->core.state == CORE_TRIPPED && b->core.cause == kinds[i].cause);
    bench_line(b, ">reset %u", kinds[i].cause);
    bench_run(b, 50);
    bench_boot(b, CORE_POWER);
    CHECK(b->core.state == CORE_STANDBY);
  }
}

typedef void (*scene)(struct bench *b);

static void light(struct bench *b) { CHECK(bench_light(b)); }

/*
 * Brings the bench there, then lets `act` run with power failing at its write number `at`, which
 * leaves `torn`. 0 when the act needs no such write any more.
 */
static uint8_t cut_at(struct bench *b, scene there, scene act, int32_t at, uint8_t torn) {
  bench_make(b);
  b->nv_busy_passes = 4;
  bench_boot(b, CORE_POWER);
  there(b);
  bench_run(b, 100);
  b->nv_cut_after = at;
  b->nv_torn = torn;
  act(b);
  uint8_t failed = b->powerless;
  b->nv_cut_after = -1;
  return failed;
}

static uint32_t permit_refused(struct bench *b) {
  uint32_t lit = b->light_ticks;
  bench_hold(b, 300, 1200, 1000, 500);
  return b->light_ticks - lit;
}

static void trip(struct bench *b) {
  bench_bytes(b, "dark\n", 5);
  bench_run(b, 100);
}

void test_torn_trip(struct bench *b) {
  int32_t at = 0;
  for (uint8_t more = 1; more && at < 40; at++) {
    for (unsigned v = 0; v < sizeof torn_values; v++) {
      more = cut_at(b, light, trip, at, torn_values[v]);
      bench_boot(b, CORE_POWER);
      CHECK(b->core.state == CORE_TRIPPED);
      CHECK(b->core.cause == CORE_CAUSE_BARE_DARK || b->core.cause == CORE_CAUSE_POWER_LOST);
      CHECK(permit_refused(b) == 0);
    }
  }
  CHECK(at == 9); /* eight bytes: two latches, the mark */
}

static void none(struct bench *b) { bench_curve(b, 4400); }
static void arm(struct bench *b) { (void)bench_light(b); }

/* Until the lit mark stands there is no light; from then on a reset finds it. */
void test_torn_arm(struct bench *b) {
  int32_t at = 0;
  for (uint8_t more = 1; more && at < 40; at++) {
    for (unsigned v = 0; v < sizeof torn_values; v++) {
      more = cut_at(b, none, arm, at, torn_values[v]);
      uint8_t had_light = (more ? b->light_at_cut : b->light_ticks) > 0;
      bench_boot(b, CORE_WATCHDOG);
      if (more) CHECK(!had_light);
      if (!more) CHECK(had_light);
      if (had_light) CHECK(b->core.state == CORE_TRIPPED && b->core.cause == 6);
      CHECK(b->core.state == CORE_STANDBY || b->core.cause == 6);
      CHECK(permit_refused(b) == 0);
    }
  }
  CHECK(at == 9); /* six bytes of a counter, two of the mark */
}

/* However slow the memory: no light until the mark stands. */
void test_mark_before_light(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_arm(b));
  b->nv_busy = 7000;
  b->core.latch_dirty = 1;
  bench_hold(b, 6500, 1200, 1000, 500);
  CHECK(b->core.state == CORE_ARMED && b->light_ticks == 0);
  bench_hold(b, 1000, 1200, 1000, 500);
  CHECK(b->drive == 1000);
}

static void person(struct bench *b) {
  bench_line(b, ">dark 0");
  bench_run(b, 100);
}

void test_torn_dark(struct bench *b) {
  int32_t at = 0;
  for (uint8_t more = 1; more && at < 40; at++) {
    for (unsigned v = 0; v < sizeof torn_values; v++) {
      more = cut_at(b, light, person, at, torn_values[v]);
      bench_boot(b, CORE_BROWN_OUT);
      CHECK(b->core.state == CORE_STANDBY || b->core.cause == CORE_CAUSE_BROWN_OUT);
      if (!more) CHECK(b->core.state == CORE_STANDBY);
      CHECK(permit_refused(b) == 0);
    }
  }
  CHECK(at == 3);
}

static void tripped(struct bench *b) {
  light(b);
  bench_run(b, 600);
}

static void reset(struct bench *b) {
  bench_line(b, ">reset 2");
  bench_run(b, 100);
}

/* The latch is cleared whole or not at all; a half-cleared one is still a latch. */
void test_torn_reset(struct bench *b) {
  int32_t at = 0;
  for (uint8_t more = 1; more && at < 40; at++) {
    for (unsigned v = 0; v < sizeof torn_values; v++) {
      more = cut_at(b, tripped, reset, at, torn_values[v]);
      bench_boot(b, CORE_POWER);
      uint8_t cause = b->core.cause;
      CHECK(b->core.state == (more ? CORE_TRIPPED : CORE_STANDBY) || at == 5 || torn_values[v] == 0x3C);
      if (at < 3) CHECK(b->core.state == CORE_TRIPPED && cause == 2);
      if (b->core.state == CORE_TRIPPED) CHECK(cause == 2 || cause == CORE_CAUSE_UNKNOWN);
      bench_line(b, ">reset %u", cause);
      bench_run(b, 100);
      CHECK(bench_light(b));
    }
  }
  CHECK(at == 7);
}

static void many_boots(struct bench *b) {
  for (int i = 0; i < 17; i++) {
    CHECK(bench_arm(b));
    bench_line(b, ">dark 0");
    bench_run(b, 100);
    bench_boot(b, CORE_POWER);
  }
  bench_curve(b, 4400);
}

static void ask(struct bench *b) {
  bench_line(b, ">ask arm");
  bench_run(b, 60);
}

/* No boot number is ever given out twice, wherever the power fails. */
void test_torn_counter(struct bench *b) {
  int32_t at = 0;
  for (uint8_t more = 1; more && at < 40; at++) {
    for (unsigned v = 0; v < sizeof torn_values; v++) {
      more = cut_at(b, many_boots, ask, at, torn_values[v]);
      uint32_t given = bench_heard(b, "<offer arm ") ? b->core.boot : 17;
      CHECK(given == 17 || !more);
      bench_boot(b, CORE_POWER);
      CHECK(bench_arm(b) && b->core.boot > given);
    }
  }
  CHECK(at == 4); /* counter 18 over 2: one byte differs, and the checksum */
  /* The very first slot of a board's life. */
  for (at = 0; at < 6; at++) {
    CHECK(cut_at(b, none, ask, at, 0x42));
    bench_boot(b, CORE_POWER);
    CHECK(bench_arm(b) && b->core.boot == 1);
  }
}

void test_memory_broken(struct bench *b) {
  b->nv_broken = 1;
  bench_boot(b, CORE_POWER);
  CHECK(b->core.state == CORE_TRIPPED && b->core.cause == CORE_CAUSE_MEMORY);
  bench_curve(b, 4400);
  bench_line(b, ">reset 19");
  bench_curve(b, 4400);
  bench_line(b, ">ask arm");
  CHECK(bench_heard(b, "<no ask memory "));
  /* The latch's bytes lost, the counter's not: nobody knows what they said. */
  bench_make(b);
  bench_boot(b, CORE_POWER);
  CHECK(bench_arm(b));
  bench_line(b, ">dark 0");
  bench_run(b, 50);
  memset(b->nv, 0xFF, 8);
  bench_boot(b, CORE_POWER);
  CHECK(b->core.state == CORE_TRIPPED && b->core.cause == CORE_CAUSE_POWER_LOST);
  /* All slots garbage: nobody knows which numbers were given out. */
  bench_make(b);
  for (int i = 16; i < 112; i++) b->nv[i] = (uint8_t)(i * 7);
  bench_boot(b, CORE_POWER);
  bench_curve(b, 4400);
  bench_line(b, ">ask arm");
  CHECK(bench_heard(b, "<no ask memory "));
  /* Writes that never take: no offer, an answer all the same. */
  bench_make(b);
  bench_boot(b, CORE_POWER);
  bench_curve(b, 4400);
  b->powerless = 1;
  bench_line(b, ">ask arm");
  bench_run(b, 160);
  CHECK(bench_heard(b, "<no ask memory "));
}

/* Everything the board was told, told again with the same pauses. */
static void replay(struct bench *b, const struct bench *told, uint32_t shift) {
  uint32_t i = 0;
  while (i < told->record_length) {
    while (i < told->record_length && (int32_t)(told->record_tick[i] + shift - b->tick) <= 0) {
      core_byte(&b->core, told->record[i++]);
    }
    bench_tick(b);
    CHECK(b->core.state != CORE_ARMED);
  }
  bench_run(b, 1000);
  CHECK(b->light_ticks == 0);
}

void test_replay(struct bench *b) {
  struct bench *told = malloc(sizeof *told);
  if (told == 0) abort();
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  bench_hold(b, 2000, 1500, 1400, 500);
  bench_line(b, ">dark 0");
  CHECK(bench_light(b));
  bench_run(b, 600);
  bench_line(b, ">reset 2");
  CHECK(bench_light(b));
  bench_line(b, ">dark 0");
  bench_run(b, 100);
  memcpy(told, b, sizeof *told);
  /* The same board after a reset: same memory, same clock from its start, same jitter. */
  bench_make(b);
  memcpy(b->nv, told->nv, sizeof b->nv);
  bench_boot(b, CORE_POWER);
  replay(b, told, 0);
  const char *first = strstr(told->sent, "<offer arm "), *again = strstr(b->sent, "<offer arm ");
  CHECK(first && again && strncmp(first, again, 19) != 0); /* another boot, another number */
  /* One whose tick is about to wrap. */
  bench_make(b);
  memcpy(b->nv, told->nv, sizeof b->nv);
  b->tick = 0xFFFFFFFFu - 9000u;
  bench_boot(b, CORE_POWER);
  replay(b, told, b->tick - 600);
  /* Another board with erased memory: only its jitter differs. */
  bench_make(b);
  b->noise = 4711;
  bench_boot(b, CORE_POWER);
  replay(b, told, 0);
  free(told);
}
