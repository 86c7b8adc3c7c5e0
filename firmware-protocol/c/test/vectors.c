/*
 * Judges lines as the core does: reads one line in hex a line, prints `ok VERB` or how it is broken.
 * Each is fed to a whole core through its receive interrupt; its counters must agree.
 */
#include <stdio.h>
#include <string.h>

#include "bench.h"
#include "parts.h"

void check(uint8_t fact, const char *text, const char *file, int line) {
  if (!fact) printf("%s:%d: %s\n", file, line, text);
}

static const char *const verdicts[] = {"ok",        "empty", "long", "char",
                                       "direction", "crc",   "verb", "form"};

static uint32_t read_hex(const char *text, uint8_t *out) {
  uint32_t n = 0;
  unsigned byte = 0;
  for (; n < 2000 && sscanf(text, "%2x", &byte) == 1; text += 2) out[n++] = (uint8_t)byte;
  return n;
}

/* The counter that a verdict moves. */
static uint32_t counter(const struct core_counts *n, uint8_t verdict) {
  const uint32_t by[] = {n->good, 0, n->too_long, n->crc, n->crc, n->crc, n->verb, n->form};
  return by[verdict];
}

static void judge(struct bench *b, const uint8_t *bytes, uint32_t length) {
  struct core_order order;
  struct core_counts before = b->core.counts;
  bench_bytes(b, bytes, length);
  bench_bytes(b, "\n", 1);
  bench_run(b, 3);
  if (b->core.counts.bare != before.bare) {
    printf("dark\n");
    return;
  }
  uint8_t verdict = core_judge_line(bytes, (uint16_t)length, &order);
  uint32_t moved = counter(&b->core.counts, verdict) - counter(&before, verdict);
  printf("%s", moved == (verdict != LINE_EMPTY) ? verdicts[verdict] : "core and judge differ");
  if (verdict == LINE_GOOD) {
    printf(" ");
    for (uint8_t i = 0; core_verb_letter(order.verb, i); i++) {
      putchar(core_verb_letter(order.verb, i));
    }
  }
  printf("\n");
}

int main(void) {
  static struct bench bench;
  static char text[4100];
  static uint8_t bytes[2000];
  bench_make(&bench);
  bench_boot(&bench, CORE_POWER);
  while (fgets(text, sizeof text, stdin)) {
    bench.sent_length = 0;
    judge(&bench, bytes, read_hex(text, bytes));
  }
  return 0;
}
