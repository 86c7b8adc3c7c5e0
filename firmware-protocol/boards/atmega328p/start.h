/* What runs before memory is cleared. */
#ifndef BOARD_START_H
#define BOARD_START_H

#include <stdint.h>

/* The chip's reset flags as they stood. */
extern uint8_t start_flags;

#endif
