/* What the parts of this firmware share: the one core. */
#ifndef BOARD_FIRMWARE_H
#define BOARD_FIRMWARE_H

#include "core.h"

extern struct core core;

#endif
