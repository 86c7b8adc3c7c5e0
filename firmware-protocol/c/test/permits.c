/* The permit: refusals, expiry by the judged sample's tick, the ring, and what wraps. */
#include <stdio.h>
#include <string.h>

#include "bench.h"

static uint8_t refused(struct bench *b, const char *reason, uint32_t n, unsigned cap, unsigned aim,
                       unsigned term) {
  char wanted[64];
  struct core_permit before = b->core.permit;
  bench_line(b, ">permit %08X %u %u %u %u", (unsigned)b->session, (unsigned)n, cap, aim, term);
  snprintf(wanted, sizeof wanted, "<no permit %s %u ", reason, (unsigned)n);
  return (uint8_t)(bench_heard(b, wanted) && before.n == b->core.permit.n &&
                   before.aim == b->core.permit.aim && before.live == b->core.permit.live);
}

void test_permit_refusals(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(refused(b, "session", b->core.seq, 1200, 1000, 500));
  CHECK(bench_light(b));
  uint32_t n = b->core.seq;
  CHECK(refused(b, "unknown", n + 1, 1200, 1000, 500));
  CHECK(refused(b, "unknown", n - 70, 1200, 1000, 500));
  CHECK(refused(b, "stale", b->core.permit.n, 1200, 1000, 500));
  CHECK(refused(b, "stale", b->core.permit.n - 1, 1200, 1000, 500));
  n = b->core.seq;
  CHECK(n != b->core.permit.n);
  CHECK(refused(b, "term", n, 1200, 1000, 149));
  CHECK(refused(b, "term", n, 1200, 1000, 10001));
  CHECK(refused(b, "over", n, 4401, 1000, 500));
  CHECK(refused(b, "over", n, 1000, 1001, 500));
  bench_line(b, ">permit %08X %u 1200 1000 500 10/20", (unsigned)b->session, (unsigned)n);
  CHECK(bench_heard(b, "<no permit capability "));
  b->session ^= 1;
  CHECK(refused(b, "session", n, 1200, 1000, 500));
  b->session ^= 1;
  bench_permit(b, 1200, 1000, 500);
  CHECK(b->core.state == CORE_ARMED && b->drive == 1000);
}

/* Light ends at tick(n) + term, whenever the line came. */
void test_expiry(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  bench_run(b, 100);
  uint32_t n = b->core.seq;
  uint32_t n_tick = b->tick - b->tick % 20;
  bench_run(b, 130); /* the line is late by 130 ms and more */
  bench_line(b, ">permit %08X %u 1200 1000 300", (unsigned)b->session, (unsigned)n);
  CHECK(b->core.permit.n == n && b->core.permit.age == b->tick - n_tick);
  bench_run(b, n_tick + 299 - b->tick);
  CHECK(b->drive == 1000);
  bench_tick(b);
  CHECK(b->drive == 0 && b->core.state == CORE_TRIPPED && b->core.cause == 2);
  /* A line as old as its term is refused, and an expired permit is erased. */
  CHECK(b->core.permit.live == 0 && b->core.session == 0);
  bench_line(b, ">permit %08X %u 1200 1000 300", (unsigned)b->session, (unsigned)b->core.seq);
  CHECK(bench_heard(b, "<no permit session "));
}

void test_ring(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_arm(b));
  CHECK(b->core.seq < 60);
  CHECK(refused(b, "unknown", b->core.seq - 60, 1200, 0, 9000)); /* a place never filled */
  bench_permit(b, 1200, 0, 9000);
  bench_run(b, 3000);
  uint32_t newest = b->core.seq;
  CHECK(refused(b, "unknown", newest - 64, 1200, 0, 9000));
  CHECK(refused(b, "old", newest - 63, 1200, 0, 1200));
  bench_line(b, ">permit %08X %u 1200 0 9000", (unsigned)b->session, (unsigned)(newest - 63));
  CHECK(b->core.permit.n == newest - 63 && b->core.permit.age >= 63 * 20);
  CHECK(b->core.permit.age < 64 * 20 + 5);
}

void test_anchors(struct bench *b) {
  b->board.anchor_every = 4;
  b->reading_ticks = 5;
  bench_boot(b, CORE_POWER);
  CHECK(bench_arm(b));
  bench_run(b, 1000);
  uint32_t anchor = b->core.anchor_seq;
  CHECK(b->core.seq - anchor < 4);
  for (uint32_t i = 1; i < 4; i++) CHECK(refused(b, "unknown", anchor - i, 1200, 0, 5000));
  CHECK(refused(b, "unknown", anchor - 256, 1200, 0, 5000));
  bench_line(b, ">permit %08X %u 1200 0 5000", (unsigned)b->session, (unsigned)(anchor - 240));
  CHECK(b->core.permit.n == anchor - 240 && b->core.permit.age >= 1200);
  bench_line(b, ">permit %08X %u 1200 0 5000", (unsigned)b->session, (unsigned)anchor);
  CHECK(b->core.permit.n == anchor && b->core.permit.age < 30);
}

/* Sample numbers and ticks pass 2^32 while lit, then the host falls silent. */
void test_wraps(struct bench *b) {
  b->tick = 0xFFFFFFFFu - 12000u;
  bench_boot(b, CORE_POWER);
  b->core.seq = 0xFFFFFFFFu - 400u;
  CHECK(bench_light(b));
  CHECK(b->tick > 0xF0000000u && b->core.seq > 0xF0000000u);
  bench_hold(b, 12000, 1200, 1000, 500);
  CHECK(b->tick < 0x10000u && b->core.seq < 0x10000u);
  CHECK(b->core.state == CORE_ARMED && b->drive == 1000 && b->unheld_light == 0);
  bench_run(b, 600);
  CHECK(b->drive == 0 && b->core.cause == 2 && b->unheld_light == 0);
}

void test_delay_again(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  bench_hold(b, 9000, 1200, 0, 500);
  CHECK(b->drive == 0 && b->core.state == CORE_ARMED);
  bench_hold(b, 800, 1200, 1000, 500);
  CHECK(b->drive == 1000); /* under ten seconds of zero: at once, by the slew */
  bench_hold(b, 10500, 1200, 0, 500);
  uint32_t lit = b->light_ticks;
  bench_hold(b, 3900, 1200, 1000, 500);
  CHECK(b->light_ticks == lit);
  bench_hold(b, 800, 1200, 1000, 500);
  CHECK(b->drive == 1000 && b->unheld_light == 0);
}

void test_slew_and_clip(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  bench_permit(b, 4000, 3000, 500);
  CHECK(b->drive <= 1008);
  bench_run(b, 249); /* 4000 counts a second */
  CHECK(b->drive >= 1990 && b->drive <= 2004);
  bench_permit(b, 1500, 1400, 500);
  CHECK(b->drive == 1400); /* down at once */
  bench_permit(b, 4400, 4400, 500);
  bench_hold(b, 900, 4400, 4400, 500);
  CHECK(b->drive == 4400 && b->core.state == CORE_ARMED);
}

void test_age_reported(struct bench *b) {
  char wanted[32];
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  bench_run(b, 20);
  uint32_t n = b->core.seq;
  bench_run(b, 70);
  bench_line(b, ">permit %08X %u 1200 1000 500", (unsigned)b->session, (unsigned)n);
  unsigned age = b->core.permit.age;
  CHECK(age >= 70 && age < 95);
  bench_run(b, 20);
  snprintf(wanted, sizeof wanted, " 0 %u %u ", (unsigned)n, age);
  CHECK(strstr(b->sent + b->mark, wanted) != 0);
}

/*
 * Buffers that hold everything back for a while, in both directions: the host permits what it last
 * saw, its lines arrive late, all at once. Light never outlasts the term after the judged sample.
 */
static void stuck(struct bench *b, uint32_t hold_ticks) {
  static char late[64][80];
  CHECK(bench_light(b));
  uint32_t n = b->core.seq, n_tick = b->tick - b->tick % 20;
  uint32_t lines = 0, start = b->tick;
  while (b->tick - start < hold_ticks) {
    bench_run(b, 100);
    if (lines < 64) snprintf(late[lines], sizeof late[0], ">permit %08X %u 1200 1000 500",
                             (unsigned)b->session, (unsigned)(n + lines));
    lines++;
  }
  uint32_t newest = n + lines - 1; /* judged, as far as the host saw: 20 ms apart */
  uint32_t end = n_tick + (newest - n) * 20 + 500;
  for (uint32_t i = 0; i < lines && i < 64; i++) bench_line(b, "%s", late[i]);
  b->end_tick = end;
  bench_run(b, 800);
  CHECK(b->drive == 0 && b->core.state == CORE_TRIPPED && b->unheld_light == 0);
}

void test_stuck_buffers(struct bench *b) {
  bench_boot(b, CORE_POWER);
  stuck(b, 200);
  bench_line(b, ">reset 2");
  stuck(b, 2000);
}

void test_numbers(struct bench *b) {
  static const uint32_t numbers[] = {0,     9,      10,     255,      65535,      65536,
                                     70000, 131071, 131072, 99999999, 2147483648, 4294967295};
  bench_boot(b, CORE_POWER);
  for (unsigned i = 0; i < sizeof numbers / sizeof numbers[0]; i++) {
    CHECK(refused(b, "session", numbers[i], 1, 1, 500));
  }
}
