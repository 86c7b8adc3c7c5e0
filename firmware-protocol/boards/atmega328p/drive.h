/* The one place that can make current: pulse width, enable pin, indicator. */
#ifndef BOARD_DRIVE_H
#define BOARD_DRIVE_H

#include <stdbool.h>
#include <stdint.h>

#define DRIVE_MAX 1023u

/* Output pins to their dark levels. The first thing the program does. */
void drive_init(void);

/* Sets the pulse width in counts, 0 … DRIVE_MAX; zero disconnects the pin. After a cut everything
 * but zero is ignored until zero came. */
void drive_set(uint16_t counts);

/* Disconnects the pin at once; for interrupts. */
void drive_cut(void);

/* One edge into the one-shot while enabled, else low. Called only at the end of a whole pass of the
 * main loop, which comes once a tick. */
void drive_enable(bool enabled);

void drive_indicate(bool on);

#endif
