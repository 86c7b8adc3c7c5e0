/* Proof injections: only worse, only under a number, five seconds. */
#include <stdio.h>
#include <string.h>

#include "bench.h"

static uint8_t inject(struct bench *b, const char *row) {
  char wanted[40];
  bench_line(b, ">ask inject");
  if (!bench_heard(b, "<offer inject ")) return 0;
  b->number = b->core.offer.number;
  bench_line(b, ">inject %s %08X", row, (unsigned)bench_answer(b));
  snprintf(wanted, sizeof wanted, "<yes inject %s ", row);
  return bench_heard(b, wanted);
}

void test_injections(struct bench *b) {
  static const struct {
    const char *row;
    uint8_t cause;
  } rows[] = {{"case-over", 11}, {"case-open", 12}, {"case-short", 13}, {"over-ceiling", 8},
              {"key", 16},       {"loop", 17},      {"supply-low", 14}};
  for (unsigned i = 0; i < sizeof rows / sizeof rows[0]; i++) {
    bench_make(b);
    bench_boot(b, CORE_POWER);
    CHECK(bench_light(b));
    CHECK(inject(b, rows[i].row));
    bench_hold(b, 200, 1200, 900, 500);
    CHECK(b->core.state == CORE_TRIPPED && b->core.cause == rows[i].cause);
    CHECK(b->drive == 0);
    uint32_t seq = 0, status = 0, cause = 0;
    CHECK(bench_sample(b, &seq, &status, &cause) && (status & 0x80) != 0);
    bench_run(b, 5600);
    CHECK(bench_sample(b, &seq, &status, &cause) && (status & 0x80) == 0);
    bench_line(b, ">reset %u", rows[i].cause);
    CHECK(bench_heard(b, "<yes reset "));
    CHECK(bench_light(b));
  }
}

void test_injection_rules(struct bench *b) {
  bench_boot(b, CORE_POWER);
  bench_curve(b, 4400);
  bench_line(b, ">inject key 00000000");
  CHECK(bench_heard(b, "<no inject none "));
  bench_line(b, ">inject teapot 00000000");
  CHECK(bench_heard(b, "<no inject range "));
  CHECK(inject(b, "supply-low"));
  bench_line(b, ">ask arm");
  CHECK(bench_heard(b, "<no ask injected "));
  bench_line(b, ">ask inject");
  CHECK(bench_heard(b, "<no ask injected "));
  bench_run(b, 5000);
  /* A number for injecting does not arm, nor the other way round. */
  bench_line(b, ">ask inject");
  b->number = b->core.offer.number;
  bench_line(b, ">arm %08X", (unsigned)bench_answer(b));
  CHECK(bench_heard(b, "<no arm none ") && b->core.state == CORE_STANDBY);
  /* While one runs the aim may fall, not rise. */
  CHECK(bench_light(b));
  b->core.case_counts = CASE_COLD;
  CHECK(inject(b, "supply-low"));
  bench_line(b, ">permit %08X %u 1200 1100 500", (unsigned)b->session, (unsigned)b->core.seq);
  CHECK(bench_heard(b, "<no permit injected ") || b->core.state == CORE_TRIPPED);
  b->board.inject = 0;
  bench_line(b, ">ask inject");
  CHECK(bench_heard(b, "<no ask capability "));
  bench_line(b, ">inject key 00000000");
  CHECK(bench_heard(b, "<no inject capability "));
}
