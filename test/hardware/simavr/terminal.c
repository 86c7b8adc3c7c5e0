#define _GNU_SOURCE
#include "terminal.h"

#include <fcntl.h>
#include <poll.h>
#include <pty.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>
#include <termios.h>
#include <time.h>
#include <unistd.h>

#include "commands.h"

#define STEP_CYCLES CYCLES_A_MS
#define STEP_NS 1000000
#define BEHIND_NS_MAX 100000000 /* a machine that stood still longer than this is not caught up */
#define COMMAND_BYTES_MAX 1024

static int master;
static bool opened;

static void onSent(uint8_t byte) {
  if (!opened) return;
  /* A full buffer loses the byte: a reader that stopped must not stop the board. */
  if (write(master, &byte, 1) != 1) return;
}

static int64_t now_ns(void) {
  struct timespec t;
  clock_gettime(CLOCK_MONOTONIC, &t);
  return (int64_t)t.tv_sec * 1000000000 + t.tv_nsec;
}

static bool openPty(void) {
  int slave = -1;
  char path[64];
  struct termios raw;
  memset(&raw, 0, sizeof raw);
  cfmakeraw(&raw);
  if (openpty(&master, &slave, path, &raw, NULL) != 0) {
    perror("openpty");
    return false;
  }
  close(slave); /* from here on the master hangs up whenever nobody has the port open */
  fcntl(master, F_SETFL, O_NONBLOCK);
  printf("pty %s\n", path);
  fflush(stdout);
  return true;
}

static void readPort(const struct pollfd *port) {
  opened = !(port->revents & POLLHUP);
  if (!(port->revents & POLLIN)) return;
  uint8_t bytes[256];
  const ssize_t count = read(master, bytes, sizeof bytes);
  for (ssize_t n = 0; n < count; n++) chip_receive(bytes[n], false);
}

/* False when standard input has ended. */
static bool readCommands(const struct pollfd *input) {
  static char line[COMMAND_BYTES_MAX];
  static size_t used;
  if (!(input->revents & (POLLIN | POLLHUP))) return true;
  const ssize_t count = read(STDIN_FILENO, line + used, sizeof line - 1 - used);
  if (count <= 0) return false;
  used += (size_t)count;
  line[used] = 0;
  for (char *end = strchr(line, '\n'); end; end = strchr(line, '\n')) {
    *end = 0;
    const size_t taken = (size_t)(end + 1 - line);
    char command[COMMAND_BYTES_MAX];
    memcpy(command, line, taken);
    memmove(line, line + taken, used + 1 - taken);
    used -= taken;
    commands_do(command, false);
  }
  if (used == sizeof line - 1) used = 0; /* over-long: dropped */
  return true;
}

int terminal_serve(void) {
  if (!openPty()) return 1;
  commands_sent = onSent;
  int64_t due_ns = now_ns();
  for (;;) {
    struct pollfd fds[2] = {{master, POLLIN, 0}, {STDIN_FILENO, POLLIN, 0}};
    if (poll(fds, 2, 0) < 0) return 1;
    readPort(&fds[0]);
    if (!readCommands(&fds[1])) return 0;
    chip_run(chip_cycle() + STEP_CYCLES, false);
    due_ns += STEP_NS;
    const int64_t ahead_ns = due_ns - now_ns();
    if (ahead_ns < -BEHIND_NS_MAX) due_ns = now_ns();
    if (ahead_ns > 0) {
      const struct timespec pause = {0, (long)ahead_ns};
      nanosleep(&pause, NULL);
    }
  }
}
