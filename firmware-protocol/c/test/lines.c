/* Introduction, line ends, counts, answers without room, and noise. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "bench.h"

void test_introduction(struct bench *b) {
  bench_boot(b, CORE_POWER);
  CHECK(strncmp(b->sent, "<boot bs-test-1 power ", 22) == 0);
  bench_line(b, ">who 1");
  bench_run(b, 10);
  CHECK(bench_heard(b, "<hello 1 bs-test-1 TEST-1 0 1000 4400 00000000 150 10000 20 50 "
                       "hand,toggle,inject 9 "));
  CHECK(bench_heard(b, "<channel 0 set mA 5e-1 0 5000 0 "));
  CHECK(bench_heard(b, "<channel 3 photodiode adc 1e0 -100 16383 0 "));
  CHECK(bench_heard(b, "<channel 8 supply V 5e-4 0 16383 1 "));
  CHECK(bench_heard(b, "<end 9 "));
  bench_line(b, ">who 2");
  CHECK(bench_heard(b, "<no who version 1 "));
}

void test_line_ends(struct bench *b) {
  bench_boot(b, CORE_POWER);
  b->mark = b->sent_length;
  bench_bytes(b, ">who 2 A0D1\r\n", 13);
  bench_run(b, 2);
  CHECK(bench_heard(b, "<no who version 1 "));
  CHECK(b->core.counts.good == 1);
  /* Two lines in one burst: one a pass, both obeyed. */
  bench_bytes(b, ">who 2 A0D1\n>who 2 A0D1\n", 24);
  bench_run(b, 2);
  CHECK(b->core.counts.good == 3);
  /* Halves count as one line. */
  bench_bytes(b, ">who 2", 6);
  bench_run(b, 50);
  bench_bytes(b, " A0D1\n", 6);
  bench_run(b, 1);
  CHECK(b->core.counts.good == 4);
  bench_bytes(b, "\n\r\n", 3);
  bench_run(b, 5);
  CHECK(b->core.counts.good == 4 && b->core.counts.crc == 0);
}

void test_counts(struct bench *b) {
  char longest[200];
  bench_boot(b, CORE_POWER);
  memset(longest, 'x', sizeof longest);
  bench_bytes(b, longest, 161);
  bench_run(b, 1);
  bench_bytes(b, longest, 200);
  bench_run(b, 1);
  bench_bytes(b, "\n", 1);
  CHECK(b->core.counts.too_long == 1);
  bench_bytes(b, ">who 1 0000\n", 12);
  bench_run(b, 1);
  bench_line(b, ">light 1");
  bench_line(b, ">who");
  bench_line(b, ">reset 2");
  bench_line(b, ">status");
  CHECK(bench_heard(b, "<counts 2 1 1 1 1 2 0 8 0 "));
  bench_run(b, 2500);
  bench_line(b, ">status");
  CHECK(bench_heard(b, "<counts 3 1 1 1 1 2 0 8 3 "));
}

void test_refusals_of_form(struct bench *b) {
  bench_boot(b, CORE_POWER);
  bench_line(b, ">stage 02");
  CHECK(bench_heard(b, "<no stage form "));
  bench_line(b, ">cool 00000001 5");
  CHECK(bench_heard(b, "<no cool capability "));
  bench_line(b, ">shutter close");
  CHECK(bench_heard(b, "<no shutter capability "));
  bench_line(b, ">light 1");
  CHECK(!bench_heard(b, "<no"));
}

void test_no_room(struct bench *b) {
  bench_boot(b, CORE_POWER);
  b->room = 60;
  bench_line(b, ">who 2");
  bench_run(b, 30);
  CHECK(!bench_heard(b, "<no who") && b->core.counts.good == 0);
  b->room = 0;
  bench_run(b, 1);
  CHECK(bench_heard(b, "<no who version"));
  /* Dark waits for nothing, and a line without room waits 50 ms at most. */
  b->room = 60;
  bench_line(b, ">dark 0");
  CHECK(b->core.counts.good == 2);
  bench_line(b, ">who 2");
  bench_line(b, ">dark 0");
  bench_run(b, 60);
  CHECK(b->core.counts.good == 4);
}

/* Noise, and genuine lines damaged: never light, never a crash (seed 20261201). */
void test_fuzz(struct bench *b) {
  static const char *const genuine[] = {
      ">who 1 90B2\n", ">ask arm D4F2\n", ">arm 1A2B3C4D FFF9\n", ">stage 2 2D33\n",
      ">permit 0BADF00D 1000 900 850 500 5613\n", ">point 0 100 2000 B598\n",
      ">inject over-ceiling FFFFFFFF 42AD\n", ">readback 31 47FA\n", ">reset 64 0C41\n"};
  uint32_t seed = 20261201;
  bench_boot(b, CORE_POWER);
  for (uint32_t round = 0; round < 40000; round++) {
    char bytes[64];
    seed = seed * 1664525u + 1013904223u;
    const char *line = genuine[(seed >> 8) % 9u];
    uint32_t n = (uint32_t)strlen(line);
    memcpy(bytes, line, n);
    if (seed & 0x40000000u) bytes[(seed >> 16) % n] = (char)(seed >> 3);
    if (seed & 0x80000000u) n = (seed >> 12) % n;
    bench_bytes(b, bytes, n);
    bench_tick(b);
    if (b->sent_length > BENCH_SENT / 2) b->sent_length = 0;
    b->record_length = 0;
  }
  CHECK(b->light_ticks == 0 && b->core.state == CORE_STANDBY);
  CHECK(b->core.counts.good > 1000 && b->core.counts.crc > 1000);
}
