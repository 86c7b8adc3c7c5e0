/*
 * A board for measuring: the controller core, natively compiled, behind a pseudo terminal, with a
 * plant in which current follows its drive at once. It times from the moment a sample line is
 * written to the moment the permit for that sample is accepted, or, against an echo, to the moment
 * the same line is back.
 *
 *   board RATE SECONDS permits|echo      prints the terminal's path, runs, prints one JSON line
 */
#define _GNU_SOURCE
#include "../../../firmware-protocol/c/core.h"
#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/prctl.h>
#include <termios.h>
#include <time.h>
#include <unistd.h>

#define SENT 4096u     /* remembered send times; a power of two */
#define TIMES 1000000u /* most figures kept */
#define CASE_25_DEGC 8192

static const struct core_channel channels[] = {
    {"set", "mA", 5, -1, 0, 5000, 0},
    {"current", "mA", 16, -2, 0, 16383, 0},
    {"case", "adc", 1, 0, 0, 16383, 0},
    {"photodiode", "adc", 1, 0, 0, 16383, 0},
};

static struct core_board board = {
    .firmware = "bs-bench-1",
    .serial = "BENCH-1",
    .caps = "toggle",
    .tick_us = 1000,
    .absolute = 4400,
    .term_min = 150,
    .term_max = 10000,
    .fall_ms = 20,
    .channels = channels,
    .channel_count = 4,
    .set = 0,
    .current = 1,
    .case_ = 2,
    .supply = CORE_NO_CHANNEL,
    .current_num = 25,
    .current_den = 8,
    .current_step = 1,
    .case_warm_is_low = 1,
    .case_over = 4326,
    .case_open = 15985,
    .case_short = 569,
    .case_fault_ms = 100,
    .dark_current = 125,
    .dark_current_ms = 100,
    .follow_ms = 50,
    .converter_stop_ms = 200,
    .emission_delay_ms = 3000,
    .slew_countsPerS = 400,
};

static int terminal;
static struct core core;
static uint16_t drive;
static uint8_t memory[CORE_NV_BYTES];
static double sent_us[SENT];
static double *figures;
static size_t figure_count;

static double now_us(void) {
  struct timespec t;
  clock_gettime(CLOCK_MONOTONIC, &t);
  return (double)t.tv_sec * 1e6 + (double)t.tv_nsec / 1e3;
}

static void keep(double us) {
  if (figure_count < TIMES) figures[figure_count++] = us;
}

static void set_drive(void *ctx, uint16_t counts) { (void)ctx, drive = counts; }
static void cut(void *ctx) { (void)ctx, drive = 0; }
static void alive(void *ctx, uint8_t on) { (void)ctx, (void)on; }
static void indicator(void *ctx, uint8_t on) { (void)ctx, (void)on; }
static int16_t nv_read(void *ctx, uint16_t at) { return (void)ctx, (int16_t)memory[at % CORE_NV_BYTES]; }
static uint8_t nv_write(void *ctx, uint16_t at, uint8_t byte) {
  (void)ctx;
  memory[at % CORE_NV_BYTES] = byte;
  return 0;
}
static uint32_t jitter(void *ctx) { return (void)ctx, (uint32_t)now_us(); }
static uint16_t send_line(void *ctx, const uint8_t *bytes, uint16_t length) {
  (void)ctx;
  if (length == 0) return 512;
  return write(terminal, bytes, length) == length ? length : 0;
}

static const struct core_port port = {0,         set_drive, cut,      alive, indicator,
                                      send_line, nv_read,   nv_write, jitter};

static int compare(const void *a, const void *b) {
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

static double at_share(double share) {
  if (figure_count == 0) return -1;
  size_t i = (size_t)(share * (double)(figure_count - 1) + 0.5);
  return figures[i] / 1000;
}

static int open_terminal(void) {
  int master = posix_openpt(O_RDWR | O_NOCTTY | O_NONBLOCK);
  if (master < 0 || grantpt(master) != 0 || unlockpt(master) != 0) {
    perror("no pseudo terminal");
    exit(1);
  }
  struct termios t;
  int slave = open(ptsname(master), O_RDWR | O_NOCTTY);
  if (slave < 0 || tcgetattr(slave, &t) != 0) {
    perror("pseudo terminal");
    exit(1);
  }
  cfmakeraw(&t);
  tcsetattr(slave, TCSANOW, &t);
  /* Kept open, so that a host may come and go. */
  printf("%s\n", ptsname(master));
  fflush(stdout);
  return master;
}

static void receive_permits(void) {
  uint8_t bytes[512];
  ssize_t n = read(terminal, bytes, sizeof bytes);
  for (ssize_t i = 0; i < n; i++) core_byte(&core, bytes[i]);
}

/* Lines written before the echo listened say nothing of its speed: the first that returns begins. */
static double echo_since_us;

static void receive_echo(void) {
  static char line[256];
  static size_t length;
  char bytes[1024];
  ssize_t n = read(terminal, bytes, sizeof bytes);
  for (ssize_t i = 0; i < n; i++) {
    if (bytes[i] != '\n') {
      if (length < sizeof line - 1) line[length++] = bytes[i];
      continue;
    }
    line[length] = 0;
    length = 0;
    unsigned long seq;
    if (sscanf(line, "<sample %lu", &seq) != 1) continue;
    if (echo_since_us == 0) echo_since_us = now_us();
    double sent = sent_us[seq & (SENT - 1)];
    if (sent > echo_since_us) keep(now_us() - sent);
  }
}

static void echo_sample(uint32_t seq) {
  char line[200];
  int length = snprintf(line, sizeof line,
                        "<sample %lu %lu 5C1B 0 %lu 3 4711 0 3600 11250 8192 8123 1A2B\n",
                        (unsigned long)seq, (unsigned long)seq, (unsigned long)seq);
  sent_us[seq & (SENT - 1)] = now_us();
  if (write(terminal, line, (size_t)length) != length) sent_us[seq & (SENT - 1)] = now_us();
}

/* One pass of the board under measurement: what came, what the core makes of it, what was accepted. */
static void pass_permits(uint32_t tick, uint32_t *seen, double *since_us) {
  receive_permits();
  core_inputs(&core, 1, 1, 1, 0);
  core_pass(&core, tick);
  if (!core.permit.seen || core.permit.n == *seen) return;
  *seen = core.permit.n;
  if (drive > 0 && *since_us == 0) *since_us = now_us();
  if (*since_us > 0) keep(now_us() - sent_us[*seen & (SENT - 1)]);
}

static void write_sample(uint32_t tick) {
  /* 1.05 W/A above 0.40 A, at 0.1 mW a count: what the bench file of the measurement says. */
  int32_t light = drive > 800 ? ((int32_t)drive - 800) * 105 / 20 : 0;
  int32_t values[4] = {drive, (int32_t)drive * 25 / 8, CASE_25_DEGC, light};
  /* The sample written next carries the next number. */
  sent_us[(core.seq + 1) & (SENT - 1)] = now_us();
  core_conversion(&core, (uint16_t)values[1], tick);
  core_reading(&core, values, tick);
}

/* Sleeps until bytes come or the next sample is due, 200 us at most. */
static void rest(double next_us) {
  struct pollfd wait = {terminal, POLLIN, 0};
  struct timespec left = {0, 200000};
  double until_us = next_us - now_us();
  if (until_us > 0 && until_us < 200) left.tv_nsec = (long)(until_us * 1000);
  ppoll(&wait, 1, &left, 0);
}

static void tell(uint32_t samples, int dark) {
  qsort(figures, figure_count, sizeof *figures, compare);
  printf("{\"samples\":%u,\"n\":%zu,\"p50\":%.4f,\"p99\":%.4f,\"p999\":%.4f,\"worst\":%.4f,"
         "\"dark\":%d}\n",
         samples, figure_count, at_share(0.5), at_share(0.99), at_share(0.999), at_share(1), dark);
}

int main(int argc, char **argv) {
  if (argc != 4) return 2;
  prctl(PR_SET_PDEATHSIG, SIGKILL);
  double rate = atof(argv[1]), seconds = atof(argv[2]);
  int echo = strcmp(argv[3], "echo") == 0;
  figures = malloc(TIMES * sizeof *figures);
  memset(memory, 0xff, sizeof memory);
  terminal = open_terminal();
  board.rate_perS = (uint16_t)rate;
  /* 64 anchors must span the term: at 1000/s every 20th sample is one. */
  board.anchor_every = (uint8_t)(rate > 100 ? rate / 50 : 1);
  double begin = now_us(), next = begin, since_us = 0;
  uint32_t samples = 0, seq = 0, seen = 0;
  if (!echo) core_init(&core, &board, &port, CORE_POWER);
  while (since_us == 0 || now_us() < since_us + seconds * 1e6) {
    double now = now_us();
    uint32_t tick = (uint32_t)((now - begin) / 1000);
    if (now >= next) {
      next += 1e6 / rate;
      if (next < now) next = now + 1e6 / rate;
      if (echo) echo_sample(++seq);
      else write_sample(tick);
      samples += since_us > 0;
    }
    if (echo) {
      receive_echo();
      since_us = echo_since_us;
    } else pass_permits(tick, &seen, &since_us);
    rest(next);
  }
  tell(samples, !echo && core.state == CORE_TRIPPED ? (int)core.cause : -1);
  return 0;
}
