/* Protection by the board's own measurements, each to its cause in its time. */
#include <stdio.h>
#include <string.h>

#include "bench.h"
#include "parts.h"

static void lit(struct bench *b) {
  bench_make(b);
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
}

static uint8_t tripped(const struct bench *b, uint8_t cause) {
  return (uint8_t)(b->core.state == CORE_TRIPPED && b->core.cause == cause && b->drive == 0);
}

/* Holds with permits for at most `ticks`; how long it took to dark. */
static uint32_t time_to_dark(struct bench *b, uint32_t ticks) {
  uint32_t start = b->tick;
  while (b->drive > 0 && b->tick - start < ticks) {
    if ((b->tick - start) % 100 == 0) bench_permit(b, 1200, 1000, 500);
    else bench_tick(b);
  }
  return b->tick - start;
}

void test_over_ceiling(struct bench *b) {
  lit(b);
  /* Cap 1200 of set is 3750 of current; 1 % more is 3787. */
  uint16_t limit = b->core.wire.limit[b->core.wire.limit_index];
  CHECK(limit == 3787);
  core_conversion(&b->core, 3788, b->tick);
  core_conversion(&b->core, 3787, b->tick);
  core_conversion(&b->core, 3788, b->tick);
  CHECK(b->drive == 1000); /* one alone is noise */
  core_conversion(&b->core, 3788, b->tick);
  CHECK(b->drive == 0);
  bench_run(b, 1);
  CHECK(tripped(b, CORE_CAUSE_OVER_CEILING));
  /* A slow converter: one over, then none for 30 ms. */
  lit(b);
  core_conversion(&b->core, 3788, b->tick);
  b->converter = 0;
  bench_run(b, 29);
  CHECK(b->drive == 1000);
  bench_run(b, 3);
  CHECK(tripped(b, CORE_CAUSE_OVER_CEILING));
}

/* A cap that falls counts at once for the drive, and after fall_ms for what is measured. */
void test_over_ceiling_falls(struct bench *b) {
  lit(b);
  bench_permit(b, 600, 500, 500);
  CHECK(b->drive == 500);
  uint16_t at_once = b->core.wire.limit[b->core.wire.limit_index];
  CHECK(at_once == 3787);
  bench_run(b, 19);
  CHECK(b->core.wire.limit[b->core.wire.limit_index] == 3787);
  bench_run(b, 10);
  CHECK(b->core.wire.limit[b->core.wire.limit_index] == 1875 + 18);
}

/* A converter whose step is 16 counts: two steps are its noise, whatever the ceiling. */
void test_coarse_converter(struct bench *b) {
  bench_make(b);
  b->board.current_step = 16;
  bench_boot(b, CORE_POWER);
  CHECK(bench_light(b));
  bench_permit(b, 300, 250, 500);
  bench_run(b, 60);
  /* Cap 300 of set is 937 of current; 1 % would be 9, less than one step. */
  CHECK(b->core.wire.limit[b->core.wire.limit_index] == 937 + 32);
}

void test_over_aim(struct bench *b) {
  lit(b);
  b->stray = 3125 / 20 - 2;
  bench_hold(b, 1000, 1200, 1000, 500);
  CHECK(b->drive == 1000);
  b->stray = 3125 / 20 + 2;
  uint32_t t = time_to_dark(b, 1000);
  CHECK(tripped(b, CORE_CAUSE_OVER_AIM) && t >= 50 && t <= 100);
}

void test_dark_current(struct bench *b) {
  bench_boot(b, CORE_POWER);
  b->stray = 124;
  bench_run(b, 500);
  CHECK(b->core.state == CORE_STANDBY);
  b->stray = 126;
  bench_run(b, 90);
  CHECK(b->core.state == CORE_STANDBY);
  bench_run(b, 60);
  CHECK(tripped(b, CORE_CAUSE_DARK_CURRENT));
  /* Light that went out by order leaves none behind. */
  lit(b);
  bench_line(b, ">dark 0");
  bench_run(b, 1000);
  CHECK(b->core.state == CORE_STANDBY);
}

void test_case_over(struct bench *b) {
  lit(b);
  b->values[2] = 4327;
  bench_hold(b, 1000, 1200, 1000, 500);
  CHECK(b->drive == 1000);
  /* Two warm readings among cold ones are noise; the median of five holds. */
  b->values[2] = 4000;
  bench_run(b, 40);
  b->values[2] = CASE_COLD;
  bench_hold(b, 500, 1200, 1000, 500);
  CHECK(b->drive == 1000);
  b->values[2] = 4326;
  uint32_t t = time_to_dark(b, 1000);
  CHECK(tripped(b, CORE_CAUSE_CASE_OVER) && t <= 100);
}

void test_case_open_short(struct bench *b) {
  lit(b);
  b->values[2] = 15985;
  bench_run(b, 60);
  b->values[2] = CASE_COLD;
  bench_hold(b, 500, 1200, 1000, 500);
  CHECK(b->drive == 1000);
  b->values[2] = 15985;
  uint32_t t = time_to_dark(b, 1000);
  CHECK(tripped(b, CORE_CAUSE_CASE_OPEN) && t >= 60 && t <= 101);
  lit(b);
  b->values[2] = 569;
  t = time_to_dark(b, 1000);
  CHECK(tripped(b, CORE_CAUSE_CASE_SHORT) && t >= 60 && t <= 101);
}

void test_supply(struct bench *b) {
  lit(b);
  b->values[8] = 9000;
  bench_run(b, 30);
  b->values[8] = 10000;
  bench_hold(b, 200, 1200, 1000, 500);
  CHECK(b->drive == 1000);
  b->values[8] = 9000;
  uint32_t t = time_to_dark(b, 1000);
  CHECK(tripped(b, CORE_CAUSE_SUPPLY_LOW) && t >= 50 && t <= 90);
  lit(b);
  b->values[8] = 11000;
  t = time_to_dark(b, 1000);
  CHECK(tripped(b, CORE_CAUSE_SUPPLY_HIGH) && t >= 50 && t <= 90);
}

void test_converter_stops(struct bench *b) {
  lit(b);
  b->converter = 0;
  uint32_t t = time_to_dark(b, 1000);
  CHECK(tripped(b, CORE_CAUSE_CONVERTER_STOPPED) && t >= 199 && t <= 202);
}

void test_key_loop(struct bench *b) {
  lit(b);
  core_inputs(&b->core, 0, 1, 1, 0); /* a blink between two passes */
  CHECK(b->drive == 0);
  bench_tick(b);
  CHECK(tripped(b, CORE_CAUSE_KEY_OFF));
  lit(b);
  core_inputs(&b->core, 1, 0, 1, 0);
  CHECK(b->drive == 0);
  bench_tick(b);
  CHECK(tripped(b, CORE_CAUSE_LOOP_OPEN));
  /* In standby an open key only forbids arming. */
  bench_make(b);
  bench_boot(b, CORE_POWER);
  b->key = 0;
  bench_run(b, 100);
  CHECK(b->core.state == CORE_STANDBY && b->core.key == 0);
}

/* An interrupt that cuts between the core's sum and its command wins, and the enable stands still. */
void test_interrupted_pass(struct bench *b) {
  lit(b);
  b->key_opens_in_drive = 1;
  bench_tick(b);
  CHECK(b->drive == 0 && b->enabled == 0);
  b->key_opens_in_drive = 0;
  bench_tick(b);
  CHECK(tripped(b, CORE_CAUSE_KEY_OFF));
}

static void load_slope(struct bench *b) {
  bench_line(b, ">stage 3");
  bench_line(b, ">point 0 4000 0");
  bench_line(b, ">point 1 5000 700");
  bench_line(b, ">point 2 12000 4400");
  bench_line(b, ">commit 00A12230");
}

/* The case warms: the drive follows the board's own curve down, rounded down, and never up past it. */
void test_curve_limits(struct bench *b) {
  bench_boot(b, CORE_POWER);
  load_slope(b);
  CHECK(bench_arm(b));
  b->values[2] = 8000;
  bench_hold(b, 6000, 4400, 4400, 500);
  CHECK(b->drive == 700 + 3700 * 3000 / 7000);
  uint32_t seq = 0, status = 0, cause = 0;
  CHECK(bench_sample(b, &seq, &status, &cause) && (status & 0x40) != 0);
  for (int32_t x = 8000; x >= 4400; x -= 7) {
    b->values[2] = x;
    bench_hold(b, 100, 4400, 4400, 500);
    uint32_t wanted = x >= 5000 ? 700u + (uint32_t)(3700 * (x - 5000) / 7000)
                                : (uint32_t)(700 * (x - 4000) / 1000);
    CHECK(b->drive == wanted);
  }
  b->values[2] = 12001; /* outside the curve: zero */
  bench_hold(b, 100, 4400, 4400, 500);
  CHECK(b->drive == 0 && b->core.state == CORE_ARMED);
}

void test_curve_loading(struct bench *b) {
  bench_boot(b, CORE_POWER);
  bench_line(b, ">readback 0");
  CHECK(bench_heard(b, "<no readback curve "));
  bench_line(b, ">stage 1");
  CHECK(bench_heard(b, "<no stage range "));
  bench_line(b, ">stage 33");
  CHECK(bench_heard(b, "<no stage range "));
  bench_line(b, ">point 0 1 1");
  CHECK(bench_heard(b, "<no point order "));
  bench_line(b, ">stage 2");
  CHECK(bench_heard(b, "<yes stage 2 "));
  bench_line(b, ">point 1 1 1");
  CHECK(bench_heard(b, "<no point order "));
  bench_line(b, ">point 0 5 4401");
  CHECK(bench_heard(b, "<no point over "));
  bench_line(b, ">point 0 5 4400");
  bench_line(b, ">point 1 5 4400");
  CHECK(bench_heard(b, "<no point order "));
  bench_line(b, ">commit 00000000");
  CHECK(bench_heard(b, "<no commit order "));
  load_slope(b);
  CHECK(bench_heard(b, "<yes commit 00A12230 "));
  bench_line(b, ">stage 2");
  bench_line(b, ">point 0 1 1");
  bench_line(b, ">point 1 2 1");
  bench_line(b, ">commit 12345678");
  CHECK(bench_heard(b, "<no commit checksum "));
  bench_line(b, ">readback 1"); /* the old curve stands */
  CHECK(bench_heard(b, "<curve 1 5000 700 3 00A12230 "));
  bench_line(b, ">readback 3");
  CHECK(bench_heard(b, "<no readback range "));
  CHECK(bench_arm(b));
  bench_line(b, ">stage 2");
  CHECK(bench_heard(b, "<no stage state "));
  bench_line(b, ">point 0 1 1");
  CHECK(bench_heard(b, "<no point state "));
  bench_line(b, ">commit 12345678");
  CHECK(bench_heard(b, "<no commit state "));
}

void test_curve_damaged(struct bench *b) {
  lit(b);
  b->core.curve[b->core.committed].point[1].y ^= 1u;
  bench_run(b, 5);
  CHECK(tripped(b, CORE_CAUSE_CURVE_DAMAGED));
  lit(b);
  b->core.curve[b->core.committed].count = 200;
  bench_run(b, 1);
  CHECK(tripped(b, CORE_CAUSE_CURVE_DAMAGED));
}

/* An impossible state, made by hand, ends dark and latched. */
void test_defect(struct bench *b) {
  lit(b);
  b->core.permit.live = 0;
  bench_run(b, 1);
  CHECK(tripped(b, CORE_CAUSE_DEFECT));
  bench_make(b);
  b->board.anchor_every = 0;
  b->board.channel_count = 0;
  core_init(&b->core, &b->board, &b->port, CORE_POWER);
  CHECK(b->core.state == CORE_TRIPPED && b->core.cause == CORE_CAUSE_DEFECT);
}

/* Against the sum in 64 bits: between points, rounded down, whichever way the curve goes. */
void test_curve_rounds_down(struct bench *b) {
  static const struct core_curve curve = {
      {{100, 4400}, {133, 4393}, {1000, 77}, {1003, 77}, {40000, 65535}, {65535, 0}}, 6};
  (void)b;
  for (int32_t x = 100; x <= 65535; x += 3) {
    uint8_t i = 1;
    while (x > curve.point[i].x) i++;
    const struct core_point p = curve.point[i - 1], q = curve.point[i];
    int64_t span = q.x - p.x;
    int64_t whole = (int64_t)p.y * span + ((int64_t)q.y - p.y) * (x - p.x);
    CHECK(core_curve_at(&curve, x) == (uint16_t)(whole / span));
  }
  CHECK(core_curve_at(&curve, 99) == 0 && core_curve_at(&curve, 65536) == 0);
  CHECK(core_curve_at(&curve, -1) == 0);
}

/* With rare passes the value in force between two of them still counts. */
void test_peaks(struct bench *b) {
  struct core_peak p = {{0, 0, 0, 0, 0}, 0, 0};
  core_init(&b->core, &b->board, &b->port, CORE_POWER);
  core_peak_add(&p, 900);
  b->core.tick = 3;
  core_peak_pass(&b->core, &p, 900, 20);
  core_peak_add(&p, 300);
  CHECK(core_peak_top(&p) == 900);
  b->core.tick = 28;
  core_peak_pass(&b->core, &p, 300, 20);
  core_peak_add(&p, 100);
  CHECK(core_peak_top(&p) == 300);
  b->core.tick = 500;
  core_peak_pass(&b->core, &p, 700, 20);
  CHECK(core_peak_top(&p) == 700);
}
