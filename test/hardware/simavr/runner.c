/*
 * Runs the board's real firmware on a simulated ATmega328P.
 *
 *   runner FIRMWARE.elf          lockstep: time moves only by `run` (see commands.h)
 *   runner FIRMWARE.elf --pty    wall clock: prints `pty PATH`, then serves the other commands
 */
#include <signal.h>
#include <stdio.h>
#include <string.h>
#include <sys/prctl.h>

#include "commands.h"
#include "terminal.h"

#define COMMAND_BYTES_MAX 140000 /* two hex digits for every byte the wire's queue can hold */

int main(int argc, char **argv) {
  if (argc < 2 || argc > 3 || (argc == 3 && strcmp(argv[2], "--pty") != 0)) {
    fprintf(stderr, "usage: %s FIRMWARE.elf [--pty]\n", argv[0]);
    return 2;
  }
  prctl(PR_SET_PDEATHSIG, SIGKILL); /* never outlives the test that started it */
  if (!chip_load(argv[1], &commands_events)) return 1;
  if (argc == 3) return terminal_serve();

  static char line[COMMAND_BYTES_MAX];
  while (fgets(line, sizeof line, stdin)) commands_do(line, true);
  return 0;
}
