/* Runs every native test and prints what failed and the closing line. */
#include <stdio.h>

#include "bench.h"

static int failures;
static int failures_shown;

void check(uint8_t fact, const char *text, const char *file, int line) {
  if (fact) return;
  failures++;
  if (++failures_shown <= 5) printf("  %s:%d: found false: %s\n", file, line, text);
}

#define TESTS(T)                                                                             \
  T(introduction) T(line_ends) T(counts) T(refusals_of_form) T(no_room) T(fuzz)              \
  T(arming) T(arming_refused) T(number_once) T(number_dies) T(back_off) T(worn)              \
  T(boot_counter_rounds) T(first_permit) T(idle) T(idle_after_light) T(second_introduction)  \
  T(permit_refusals) T(expiry) T(ring) T(anchors) T(wraps) T(delay_again) T(slew_and_clip)   \
  T(stuck_buffers) T(numbers) T(age_reported)                                                           \
  T(darks) T(cancels_apart) T(dark_ends_buffers) T(resets) T(reset_refused)                                   \
  T(over_ceiling) T(over_ceiling_falls) T(coarse_converter) T(over_aim) T(dark_current) T(case_over)             \
  T(case_open_short) T(supply) T(converter_stops) T(key_loop) T(interrupted_pass) T(curve_limits)                \
  T(curve_loading) T(curve_rounds_down) T(peaks) T(curve_damaged) T(defect) T(injections) T(injection_rules)               \
  T(boots) T(torn_trip) T(torn_arm) T(mark_before_light) T(torn_dark) T(torn_reset) T(torn_counter)               \
  T(memory_broken) T(replay) T(random_sessions)

#define DECLARE(name) void test_##name(struct bench *b);
TESTS(DECLARE)
#define ENTRY(name) {#name, test_##name},

static struct {
  const char *name;
  void (*run)(struct bench *b);
} tests[] = {TESTS(ENTRY)};

int main(void) {
  static struct bench bench;
  int passed = 0, failed = 0;
  for (unsigned i = 0; i < sizeof tests / sizeof tests[0]; i++) {
    failures = 0;
    failures_shown = 0;
    bench_make(&bench);
    tests[i].run(&bench);
    if (failures) printf("failed: %s (%d)\n", tests[i].name, failures);
    passed += failures == 0;
    failed += failures != 0;
  }
  printf("%d passed, %d failed\n", passed, failed);
  return failed != 0;
}
