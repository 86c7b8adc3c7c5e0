/* The serial port: 115200 baud, 8 data bits, no parity, one stop bit. Received bytes go straight to
 * the core from the receive interrupt. */
#ifndef BOARD_SERIAL_H
#define BOARD_SERIAL_H

#include <stdint.h>

void serial_init(void);

/* Queues `length` bytes, all or none; returns how many were queued. With length 0 returns the free
 * room. Never waits. */
uint16_t serial_send(const uint8_t *bytes, uint16_t length);

#endif
