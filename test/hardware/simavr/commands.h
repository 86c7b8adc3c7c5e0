/*
 * The words the runner takes on its standard input, one line each, and answers on its standard
 * output: event lines first, then one line that begins with `ok` or `no`.
 *
 *   run CYCLES [line]     go on for CYCLES; with `line` stop behind the next line end sent
 *   rx HEX                put bytes on the receive wire
 *   break                 put a serial break on it
 *   adc N MV|free         hold a converter input at MV millivolts, or let the bench drive it
 *   case DEGC|free        hold the case at a temperature, or let it warm by itself
 *   hum MV HZ             mains pick-up on the case sensor's wire, amplitude and rate
 *   pin key|loop|button 0|1
 *   reset power|brown-out|external|watchdog
 *   hang SYMBOL / mend    put a jump-to-itself at a function / take it out again
 *   poke SYMBOL OFFSET HEX, peek SYMBOL OFFSET LENGTH
 *   eeprom                the whole non-volatile memory in hex
 *   stack                 bytes of stack used at the deepest
 *   state
 *
 * Events: `tx CYCLE HEX` (bytes sent, up to a line end), `out CYCLE DRIVE STAGE INDICATOR LIT`,
 * `boot CYCLE`. `ok` after run and state carries CYCLE DRIVE STAGE INDICATOR LIT EDGES UA MDEGC.
 */
#ifndef COMMANDS_H
#define COMMANDS_H

#include <stdbool.h>

#include "chip.h"

extern const struct chip_events commands_events;

/* Carries out one command. `stepped` allows `run`; without it time is the caller's. */
void commands_do(char *line, bool stepped);

/* Where sent bytes go instead of events, while set (the pty). */
extern void (*commands_sent)(uint8_t byte);

#endif
