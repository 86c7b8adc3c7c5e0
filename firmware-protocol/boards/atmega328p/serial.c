#include "serial.h"

#include <avr/interrupt.h>
#include <avr/io.h>

#include "firmware.h"

#define BAUD_DIVISOR 16u /* 16 MHz / 8 / (16 + 1) = 117647 baud, 2.1 % fast: within 8N1's 4.5 % */

/* The core wants 162 bytes at least: one longest line. */
#define SEND_BYTES 164u

static uint8_t queue[SEND_BYTES];
static volatile uint8_t count; /* bytes queued and not yet sent */
static uint8_t head;           /* main loop: where the next byte goes */
static uint8_t tail;           /* interrupt: where the next byte comes from */

void serial_init(void) {
  UCSR0A = _BV(U2X0); /* before the divisor, which is then counted in eighths */
  UBRR0 = BAUD_DIVISOR;
  UCSR0C = _BV(UCSZ01) | _BV(UCSZ00);
  UCSR0B = _BV(RXCIE0) | _BV(RXEN0) | _BV(TXEN0);
}

/* A break is a zero byte without its stop bit. Any other byte with a framing error is lost, and its
 * line fails its checksum. */
ISR(USART_RX_vect) {
  const uint8_t status = UCSR0A;
  const uint8_t byte = UDR0;
  if (!(status & _BV(FE0))) core_byte(&core, byte);
  else if (byte == 0) core_break(&core);
}

ISR(USART_UDRE_vect) {
  if (count == 0) {
    UCSR0B &= (uint8_t)~_BV(UDRIE0);
    return;
  }
  UDR0 = queue[tail];
  if (++tail == SEND_BYTES) tail = 0;
  count--;
}

uint16_t serial_send(const uint8_t *bytes, uint16_t length) {
  const uint8_t room = (uint8_t)(SEND_BYTES - count);
  if (length == 0) return room;
  if (length > room) return 0;
  for (uint8_t n = 0; n < length; n++) {
    queue[head] = bytes[n];
    if (++head == SEND_BYTES) head = 0;
  }
  UCSR0B &= (uint8_t)~_BV(UDRIE0); /* the interrupt counts down in the same byte */
  count = (uint8_t)(count + length);
  UCSR0B |= _BV(UDRIE0);
  return length;
}
