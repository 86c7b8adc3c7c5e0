#include "drive.h"

#include <avr/io.h>
#include <util/atomic.h>

#include "pins.h"

#define MODE_A (_BV(WGM11) | _BV(WGM10)) /* fast pulse width, 10 bits, with WGM12 */
#define MODE_B (_BV(WGM12) | _BV(CS10))  /* 16 MHz / 1024 = 15.6 kHz */

static volatile bool cut;

/* Fast pulse width zero is still one clock in 1024 wide. At zero the pin is an input instead, and
 * the filter's own resistor pulls it down. */
static void disconnect(void) {
  DDRB &= (uint8_t)~_BV(PIN_DRIVE);
  TCCR1A = MODE_A;
}

void drive_init(void) {
  PORTB &= (uint8_t)~(_BV(PIN_ENABLE) | _BV(PIN_DRIVE));
  disconnect();
  DDRB |= _BV(PIN_ENABLE);
  PORTD &= (uint8_t)~_BV(PIN_INDICATOR);
  DDRD |= _BV(PIN_INDICATOR);
  TCCR1B = MODE_B;
}

void drive_cut(void) {
  ATOMIC_BLOCK(ATOMIC_RESTORESTATE) {
    disconnect();
    cut = true;
  }
}

void drive_set(uint16_t counts) {
  ATOMIC_BLOCK(ATOMIC_RESTORESTATE) {
    if (counts == 0 || counts > DRIVE_MAX) { /* above is impossible, and dark answers that too */
      disconnect();
      cut = false;
    } else if (!cut) {
      OCR1A = counts;
      TCCR1A = MODE_A | _BV(COM1A1);
      DDRB |= _BV(PIN_DRIVE);
    }
  }
}

void drive_enable(bool enabled) {
  if (enabled) PINB = _BV(PIN_ENABLE); /* writing one toggles */
  else PORTB &= (uint8_t)~_BV(PIN_ENABLE);
}

void drive_indicate(bool on) {
  if (on) PORTD |= _BV(PIN_INDICATOR);
  else PORTD &= (uint8_t)~_BV(PIN_INDICATOR);
}
