/* One-time numbers, sessions, the boot counter, and what ends an idle session. */
#include <string.h>

#include "bench.h"

void test_arming(struct bench *b) {
  uint32_t seq = 0, status = 0, cause = 0;
  bench_boot(b, CORE_POWER);
  CHECK(bench_arm(b));
  CHECK(b->session != 0 && b->core.boot == 1 && b->core.arms == 1);
  bench_run(b, 20);
  CHECK(b->lit == 1 && b->drive == 0);
  CHECK(bench_sample(b, &seq, &status, &cause) && (status & 0x1407) == 0x1402);
  bench_hold(b, 3800, 1200, 1000, 500);
  CHECK(b->drive == 0 && b->light_ticks == 0); /* the emission delay holds */
  bench_hold(b, 1000, 1200, 1000, 500);
  CHECK(b->drive == 1000 && b->enabled == 1);
  bench_run(b, 20);
  CHECK(strstr(b->sent + b->mark, " 1000 3125 8191 0 ") != 0); /* set as driven, then measured */
  CHECK(bench_sample(b, &seq, &status, &cause) && (status & 0x0403) == 0x0003);
  CHECK(b->unheld_light == 0);
  bench_line(b, ">dark 0");
  CHECK(bench_heard(b, "<yes dark 0 ") && b->drive == 0 && b->core.state == CORE_STANDBY);
  bench_run(b, 2);
  CHECK(b->lit == 0 && b->enabled == 0);
  uint32_t before = b->session;
  CHECK(bench_arm(b) && b->session != before && b->core.boot == 1 && b->core.arms == 2);
}

static uint8_t refused(struct bench *b, const char *reason) {
  bench_line(b, ">ask arm");
  bench_run(b, 5);
  return (uint8_t)(bench_heard(b, reason) && !bench_heard(b, "<offer"));
}

void test_arming_refused(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(refused(b, "<no ask curve "));
  bench_curve(b, 4400);
  b->key = 0;
  CHECK(refused(b, "<no ask key "));
  b->key = 1;
  bench_run(b, 300);
  CHECK(refused(b, "<no ask key ")); /* not yet stable for 0.5 s */
  bench_run(b, 300);
  b->loop = 0;
  CHECK(refused(b, "<no ask loop "));
  b->loop = 1;
  bench_run(b, 600);
  b->values[2] = 3000; /* over 50 degC */
  bench_run(b, 200);
  CHECK(refused(b, "<no ask case "));
  b->values[2] = 16000;
  bench_run(b, 200);
  CHECK(refused(b, "<no ask case "));
  b->values[2] = CASE_COLD;
  bench_run(b, 200);
  CHECK(bench_arm(b));
  CHECK(refused(b, "<no ask state "));
}

static void ask(struct bench *b) {
  bench_line(b, ">ask arm");
  bench_run(b, 5);
  CHECK(bench_heard(b, "<offer arm "));
  b->number = b->core.offer.number;
}

void test_number_once(struct bench *b) {
  bench_boot(b, CORE_POWER);
  bench_curve(b, 4400);
  ask(b);
  uint32_t answer = bench_answer(b);
  bench_line(b, ">arm %08X", (unsigned)(answer ^ 1u));
  CHECK(bench_heard(b, "<no arm wrong "));
  bench_line(b, ">arm %08X", (unsigned)answer);
  CHECK(bench_heard(b, "<no arm none "));
  /* Another curve, another answer: the host's idea of the board must be right. */
  ask(b);
  answer = bench_answer(b);
  bench_curve(b, 4000);
  bench_line(b, ">arm %08X", (unsigned)answer);
  CHECK(bench_heard(b, "<no arm wrong ") && b->core.state == CORE_STANDBY);
  /* A key that opens between offer and answer. */
  ask(b);
  b->key = 0;
  bench_run(b, 2);
  bench_line(b, ">arm %08X", (unsigned)bench_answer(b));
  CHECK(bench_heard(b, "<no arm key "));
}

void test_number_dies(struct bench *b) {
  bench_boot(b, CORE_POWER);
  bench_curve(b, 4400);
  ask(b);
  bench_run(b, 9990);
  bench_line(b, ">arm %08X", (unsigned)bench_answer(b));
  CHECK(bench_heard(b, "<yes arm "));
  bench_line(b, ">dark 0");
  ask(b);
  bench_run(b, 10000);
  bench_line(b, ">arm %08X", (unsigned)bench_answer(b));
  CHECK(bench_heard(b, "<no arm none "));
}

void test_back_off(struct bench *b) {
  bench_boot(b, CORE_POWER);
  bench_curve(b, 4400);
  for (int i = 0; i < 3; i++) {
    ask(b);
    bench_line(b, ">arm 00000000");
    CHECK(bench_heard(b, "<no arm wrong "));
  }
  CHECK(refused(b, "<no ask back-off "));
  bench_run(b, 29900);
  CHECK(refused(b, "<no ask back-off "));
  bench_run(b, 200);
  CHECK(bench_arm(b));
}

static void put_slot(struct bench *b, uint8_t slot, uint32_t value) {
  uint8_t *p = b->nv + 16 + 6 * slot;
  uint32_t crc = 0xFFFF;
  uint8_t bytes[5] = {(uint8_t)value, (uint8_t)(value >> 8), (uint8_t)(value >> 16),
                      (uint8_t)(value >> 24), slot};
  for (int i = 0; i < 5; i++) {
    crc ^= (uint32_t)bytes[i] << 8;
    for (int k = 0; k < 8; k++) crc = (crc & 0x8000 ? (crc << 1) ^ 0x1021 : crc << 1) & 0xFFFF;
  }
  memcpy(p, bytes, 4);
  p[4] = (uint8_t)crc;
  p[5] = (uint8_t)(crc >> 8);
}

void test_worn(struct bench *b) {
  put_slot(b, 4, 0xFFFFFFFEu);
  bench_boot(b, CORE_POWER);
  CHECK(b->core.boot == 0xFFFFFFFEu && b->core.state == CORE_TRIPPED);
  bench_line(b, ">reset 5"); /* the latch's own bytes are erased, which a used memory's never are */
  bench_run(b, 50);
  CHECK(bench_arm(b) && b->core.boot == 0xFFFFFFFFu); /* the last one */
  bench_line(b, ">dark 0");
  CHECK(bench_arm(b));
  bench_line(b, ">dark 0");
  bench_run(b, 100);
  bench_boot(b, CORE_POWER);
  bench_curve(b, 4400);
  CHECK(refused(b, "<no ask worn "));
}

void test_boot_counter_rounds(struct bench *b) {
  uint32_t writes = 0;
  for (uint32_t boot = 1; boot <= 40; boot++) {
    bench_boot(b, CORE_EXTERNAL);
    CHECK(b->core.boot == boot - 1);
    CHECK(bench_arm(b) && b->core.boot == boot);
    bench_line(b, ">dark 0");
    bench_run(b, 50);
    CHECK(b->core.slot == (boot - 1) % 16);
  }
  /* A boot that nobody arms writes nothing: a watchdog loop must not wear the memory out. */
  writes = b->nv_writes;
  for (int i = 0; i < 20; i++) bench_boot(b, CORE_WATCHDOG);
  CHECK(b->nv_writes == writes && b->core.state == CORE_STANDBY);
}

void test_first_permit(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_arm(b));
  bench_run(b, 1950);
  CHECK(b->core.state == CORE_ARMED);
  bench_run(b, 100);
  CHECK(b->core.state == CORE_TRIPPED && b->core.cause == CORE_CAUSE_PERMIT_EXPIRED);
}

void test_idle(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_arm(b));
  bench_hold(b, 119000, 1200, 0, 500);
  CHECK(b->core.state == CORE_ARMED);
  bench_hold(b, 1500, 1200, 0, 500);
  CHECK(b->core.state == CORE_STANDBY && b->core.cause == CORE_CAUSE_ARMED_IDLE);
  bench_run(b, 50);
  bench_boot(b, CORE_POWER); /* no lit mark was left */
  CHECK(b->core.state == CORE_STANDBY);
}

void test_idle_after_light(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  b->record_length = BENCH_RECORD;
  for (int minute = 0; minute < 59; minute++) {
    bench_hold(b, 60000, 1200, 0, 500);
    b->sent_length = 0;
  }
  CHECK(b->core.state == CORE_ARMED);
  bench_hold(b, 61000, 1200, 0, 500);
  CHECK(b->core.state == CORE_STANDBY && b->core.cause == CORE_CAUSE_ARMED_IDLE);
}

void test_second_introduction(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  bench_line(b, ">who 1");
  CHECK(bench_heard(b, "<no who state ") && !bench_heard(b, "<hello"));
  CHECK(b->drive == 0 && b->core.state == CORE_TRIPPED);
  CHECK(b->core.cause == CORE_CAUSE_SECOND_INTRODUCTION);
  bench_line(b, ">who 1");
  CHECK(bench_heard(b, "<hello 1 "));
}
