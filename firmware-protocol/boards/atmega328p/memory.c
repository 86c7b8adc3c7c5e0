#include "memory.h"

#include <avr/io.h>
#include <util/atomic.h>

int16_t memory_read(uint16_t address) {
  if (address > E2END) return -2;
  if (EECR & _BV(EEPE)) return -1;
  EEAR = address;
  EECR |= _BV(EERE);
  return EEDR;
}

uint8_t memory_write(uint16_t address, uint8_t value) {
  if (address > E2END || (EECR & _BV(EEPE))) return 1;
  EEAR = address;
  EEDR = value;
  ATOMIC_BLOCK(ATOMIC_RESTORESTATE) { /* the second bit must follow within four cycles */
    EECR |= _BV(EEMPE);
    EECR |= _BV(EEPE);
  }
  return 0;
}
