/* The chip's EEPROM, one byte at a time and never waited for; a write takes 3.4 ms. */
#ifndef BOARD_MEMORY_H
#define BOARD_MEMORY_H

#include <stdint.h>

/* The byte at `address`; -1 while a write is under way, -2 beyond the memory. */
int16_t memory_read(uint16_t address);

/* Starts a write and returns 0; returns 1, and does nothing, while another is under way. */
uint8_t memory_write(uint16_t address, uint8_t value);

#endif
