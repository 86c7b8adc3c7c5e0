/* Every form of dark in every state, and the way back. */
#include <stdio.h>
#include <string.h>

#include "bench.h"

static uint32_t answer_of_later(struct bench *b) {
  bench_line(b, ">ask arm");
  bench_run(b, 5);
  b->number = b->core.offer.number;
  return bench_answer(b);
}

enum form { GOOD_PERSON, GOOD_HOST, BARE, BARE_CASE, BARE_LONG, BAD_CRC, BAD_CODE, CANCELS,
            CANCELS_INSIDE, BREAK, FORMS };

static void give(struct bench *b, enum form form) {
  char rest[200];
  memset(rest, 'x', sizeof rest);
  switch (form) {
    case GOOD_PERSON: bench_line(b, ">dark 0"); break;
    case GOOD_HOST: bench_line(b, ">dark 64"); break;
    case BARE: bench_bytes(b, "dark\n", 5); break;
    case BARE_CASE: bench_bytes(b, ">DaRk !\r\n", 9); break;
    case BARE_LONG: bench_bytes(b, "dark", 4); bench_bytes(b, rest, 180); break;
    case BAD_CRC: bench_bytes(b, ">dark 0 0000\n", 13); break;
    case BAD_CODE: bench_line(b, ">dark 8"); break;
    case CANCELS: bench_bytes(b, "\x18\x18\x18", 3); break;
    case CANCELS_INSIDE: bench_bytes(b, ">permit 1\x18\x18\x18 2", 14); break;
    case BREAK: core_break(&b->core); break;
    default: break;
  }
}

/* Two and one apart are no three. */
void test_cancels_apart(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  bench_bytes(b, "\x18\x18 \x18\x18\n", 6);
  bench_run(b, 3);
  CHECK(b->drive == 1000 && b->core.counts.bare == 0);
}

enum stage { STANDBY, DELAY, EMITTING, TRIPPED, STAGES };

static void bring(struct bench *b, enum stage stage) {
  bench_make(b);
  bench_boot(b, CORE_POWER);
  if (stage == STANDBY) bench_curve(b, 4400);
  if (stage == DELAY) CHECK(bench_arm(b));
  if (stage == DELAY) bench_hold(b, 1000, 1200, 1000, 500);
  if (stage == EMITTING || stage == TRIPPED) CHECK(bench_light(b));
  if (stage == TRIPPED) bench_run(b, 600);
}

static void judge(struct bench *b, enum stage stage, enum form form) {
  uint8_t open = stage == DELAY || stage == EMITTING;
  uint8_t bare = form != GOOD_PERSON && form != GOOD_HOST;
  uint8_t tripped = stage == TRIPPED || (open && form != GOOD_PERSON);
  CHECK(b->core.state == (tripped ? CORE_TRIPPED : CORE_STANDBY));
  if (stage == TRIPPED) CHECK(b->core.cause == CORE_CAUSE_PERMIT_EXPIRED);
  if (open && bare) CHECK(b->core.cause == CORE_CAUSE_BARE_DARK);
  if (open && form == GOOD_HOST) CHECK(b->core.cause == 64);
  if (open && form == GOOD_PERSON) CHECK(b->core.cause == 0);
  CHECK(b->drive == 0 && b->core.session == 0 && b->core.counts.bare == bare);
  if (form == GOOD_HOST) CHECK(bench_heard(b, "<yes dark 64 "));
}

void test_darks(struct bench *b) {
  for (int stage = 0; stage < STAGES; stage++) {
    for (int form = 0; form < FORMS; form++) {
      bring(b, (enum stage)stage);
      uint32_t lit = b->light_ticks;
      give(b, (enum form)form);
      if (form == CANCELS || form == CANCELS_INSIDE || form == BREAK) CHECK(b->drive == 0);
      bench_run(b, 2);
      judge(b, (enum stage)stage, (enum form)form);
      /* The host's loop, unaware, goes on permitting. */
      bench_hold(b, 6000, 1200, 1000, 500);
      CHECK(b->light_ticks - lit <= 1);
    }
  }
}

/* A permit and an arm line that stand behind or before the dark in the same burst do not count. */
void test_dark_ends_buffers(struct bench *b) {
  char permit[100];
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  uint32_t lit = b->light_ticks;
  bench_run(b, 20);
  lit = b->light_ticks;
  snprintf(permit, sizeof permit, ">permit %08X %u 1200 1000 500", (unsigned)b->session,
           (unsigned)b->core.seq);
  bench_bytes(b, "\x18\x18\x18\n", 4);
  bench_line(b, "%s", permit);
  bench_run(b, 3);
  CHECK(b->light_ticks == lit && b->core.state == CORE_TRIPPED);
  bench_run(b, 40);
  bench_line(b, ">reset 4");
  uint32_t answer = answer_of_later(b);
  bench_bytes(b, "dark\n", 5);
  bench_line(b, ">arm %08X", (unsigned)answer);
  bench_run(b, 3);
  CHECK(b->core.state == CORE_STANDBY);
  CHECK(bench_heard(b, "<no arm none "));
}

void test_resets(struct bench *b) {
  bench_boot(b, CORE_POWER);
  bench_line(b, ">reset 2");
  CHECK(bench_heard(b, "<no reset state "));
  CHECK(bench_light(b));
  bench_line(b, ">reset 2");
  CHECK(bench_heard(b, "<no reset state "));
  bench_run(b, 600);
  bench_line(b, ">dark 64"); /* the first cause stays */
  bench_line(b, ">dark 0");
  bench_bytes(b, "dark\n", 5);
  bench_run(b, 2);
  CHECK(b->core.state == CORE_TRIPPED && b->core.cause == 2);
  bench_line(b, ">reset 64");
  CHECK(bench_heard(b, "<no reset cause "));
  bench_line(b, ">reset 2");
  CHECK(bench_heard(b, "<yes reset 2 ") && b->core.state == CORE_STANDBY);
  CHECK(bench_light(b));
}

void test_reset_refused(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  bench_run(b, 600);
  b->key = 0;
  bench_run(b, 2);
  bench_line(b, ">reset 2");
  CHECK(bench_heard(b, "<no reset key "));
  b->key = 1;
  b->loop = 0;
  bench_run(b, 600);
  bench_line(b, ">reset 2");
  CHECK(bench_heard(b, "<no reset loop "));
  b->loop = 1;
  b->stray = 200;
  bench_run(b, 600);
  bench_line(b, ">reset 2");
  CHECK(bench_heard(b, "<no reset current "));
  b->stray = 0;
  bench_run(b, 40);
  bench_line(b, ">reset 2");
  CHECK(bench_heard(b, "<yes reset 2 "));
}
