#include "commands.h"

#include <inttypes.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define SENT_BYTES_MAX 512
#define WORDS_MAX 4

void (*commands_sent)(uint8_t byte);

static uint8_t sentBytes[SENT_BYTES_MAX];
static size_t sentCount;
static uint64_t sentCycle;

static void hexOut(const uint8_t *bytes, size_t count) {
  for (size_t n = 0; n < count; n++) printf("%02x", bytes[n]);
  putchar('\n');
}

static void flushSent(void) {
  if (sentCount == 0) return;
  printf("tx %" PRIu64 " ", sentCycle);
  hexOut(sentBytes, sentCount);
  sentCount = 0;
}

static void onSent(uint64_t cycle, uint8_t byte) {
  if (commands_sent) {
    commands_sent(byte);
    return;
  }
  sentBytes[sentCount++] = byte;
  sentCycle = cycle;
  if (byte == '\n' || sentCount == SENT_BYTES_MAX) flushSent();
}

static void onReset(uint64_t cycle) {
  if (!commands_sent) printf("boot %" PRIu64 "\n", cycle);
}

static void onOutput(uint64_t cycle) {
  if (commands_sent) return;
  printf("out %" PRIu64 " %u %d %d %d\n", cycle, chip.drive, chip.stage, chip.indicator, chip.lit);
}

const struct chip_events commands_events = {onSent, onReset, onOutput};

static void no(const char *why) { printf("no %s\n", why); }
static void ok(void) { puts("ok"); }

static void tellState(void) {
  printf("ok %" PRIu64 " %u %d %d %d %u %.0f %.0f\n", chip_cycle(), chip.drive, chip.stage,
         chip.indicator, chip.lit, chip.edges, chip.plant.current_mA * 1e3,
         chip.plant.case_degC * 1e3);
}

static int hexDigit(char c) {
  if (c >= '0' && c <= '9') return c - '0';
  if (c >= 'a' && c <= 'f') return c - 'a' + 10;
  return -1;
}

/* Decodes hex in place of its own text; returns the count of bytes, or -1. */
static long hexIn(char *text) {
  long count = 0;
  for (const char *c = text; *c; c += 2) {
    const int high = hexDigit(c[0]);
    const int low = high < 0 ? -1 : hexDigit(c[1]);
    if (low < 0) return -1;
    text[count++] = (char)(high << 4 | low);
  }
  return count;
}

static void doRx(char **w) {
  const long count = hexIn(w[1]);
  if (count < 0) return no("hex digits in pairs are wanted");
  for (long n = 0; n < count; n++) {
    if (!chip_receive((uint8_t)w[1][n], false)) return no("the wire's queue is full");
  }
  ok();
}

static void doBreak(char **w) {
  (void)w;
  if (chip_receive(0, true)) ok();
  else no("the wire's queue is full");
}

static void doAdc(char **w) {
  const long input = strtol(w[1], NULL, 10);
  if (input < 0 || input >= PLANT_INPUTS) return no("no such converter input");
  chip.plant.forced_mV[input] = strcmp(w[2], "free") == 0 ? -1 : (int32_t)strtol(w[2], NULL, 10);
  ok();
}

static void doCase(char **w) {
  chip.plant.caseHeld = strcmp(w[1], "free") != 0;
  if (chip.plant.caseHeld) chip.plant.case_degC = strtod(w[1], NULL);
  ok();
}

static void doHum(char **w) {
  chip.plant.hum_mV = strtod(w[1], NULL);
  chip.plant.hum_Hz = strtod(w[2], NULL);
  ok();
}

static void doPin(char **w) {
  const bool on = w[2][0] == '1';
  if (strcmp(w[1], "key") == 0) chip.key = on;
  else if (strcmp(w[1], "loop") == 0) chip.loop = on;
  else if (strcmp(w[1], "button") == 0) chip.button = on;
  else return no("pins are key, loop and button");
  ok();
}

static void doReset(char **w) {
  if (chip_reset(w[1])) ok();
  else no("resets are power, brown-out, external and watchdog");
}

static void doHang(char **w) {
  if (chip_hang(w[1])) ok();
  else no("no such function, or one hangs already");
}

static void doMend(char **w) {
  (void)w;
  chip_mend();
  ok();
}

static uint8_t *memoryAt(char **w, size_t length) {
  uint32_t address = 0;
  bool isData = false;
  if (!chip_symbol(w[1], &address, &isData)) return NULL;
  address += (uint32_t)strtoul(w[2], NULL, 10);
  return isData ? chip_ram(address, length) : chip_flash(address, length);
}

static void doPoke(char **w) {
  const long count = hexIn(w[3]);
  uint8_t *at = count < 0 ? NULL : memoryAt(w, (size_t)count);
  if (!at) return no("no such symbol, or outside the memory");
  memcpy(at, w[3], (size_t)count);
  ok();
}

static void doPeek(char **w) {
  const size_t length = strtoul(w[3], NULL, 10);
  const uint8_t *at = memoryAt(w, length);
  if (!at) return no("no such symbol, or outside the memory");
  printf("ok ");
  hexOut(at, length);
}

static void doEeprom(char **w) {
  (void)w;
  size_t length = 0;
  const uint8_t *bytes = chip_eeprom(&length);
  if (!bytes) return no("the memory cannot be read");
  printf("ok ");
  hexOut(bytes, length);
}

static void doStack(char **w) {
  (void)w;
  printf("ok %u\n", chip_stack());
}

static void doState(char **w) {
  (void)w;
  tellState();
}

static void doRun(char **w) {
  const uint64_t cycles = strtoull(w[1], NULL, 10);
  chip_run(chip_cycle() + cycles, w[2] != NULL);
  flushSent();
  tellState();
}

static const struct {
  const char *name;
  int words; /* that must follow */
  void (*act)(char **words);
} table[] = {{"run", 1, doRun},       {"rx", 1, doRx},       {"break", 0, doBreak},
             {"adc", 2, doAdc},       {"case", 1, doCase},   {"pin", 2, doPin},
             {"hum", 2, doHum},
             {"reset", 1, doReset},   {"hang", 1, doHang},   {"mend", 0, doMend},
             {"poke", 3, doPoke},     {"peek", 3, doPeek},   {"eeprom", 0, doEeprom},
             {"stack", 0, doStack},   {"state", 0, doState}};

void commands_do(char *line, bool stepped) {
  char *words[WORDS_MAX + 1] = {NULL};
  int count = 0;
  for (char *word = strtok(line, " \n"); word && count < WORDS_MAX; word = strtok(NULL, " \n")) {
    words[count++] = word;
  }
  for (size_t n = 0; count > 0 && n < sizeof table / sizeof table[0]; n++) {
    if (strcmp(words[0], table[n].name) != 0) continue;
    if (count - 1 < table[n].words) no("a word is missing");
    else if (!stepped && table[n].act == doRun) no("time runs by itself on a pty");
    else table[n].act(words);
    fflush(stdout);
    return;
  }
  no("no such command");
  fflush(stdout);
}
