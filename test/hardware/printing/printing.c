/** Firmware as people have it already: it prints time, current and temperature, and listens to nobody. */
#define F_CPU 16000000UL
#include <avr/io.h>
#include <stdio.h>
#include <util/delay.h>

static int put(char c, FILE *stream) {
  (void)stream;
  while (!(UCSR0A & (1 << UDRE0))) {
  }
  UDR0 = (unsigned char)c;
  return 0;
}

int main(void) {
  static FILE wire = FDEV_SETUP_STREAM(put, NULL, _FDEV_SETUP_WRITE);
  UCSR0A = 1 << U2X0;
  UBRR0 = 16; /* 115200 baud */
  UCSR0B = 1 << TXEN0;
  fprintf(&wire, "lab driver 1.3\r\nms,I_mA,T_C\r\n");
  for (unsigned long ms = 0;; ms += 20) {
    unsigned warm = (unsigned)(ms / 1000 * 3 + ms / 20 % 2); /* 0.3 K a second, and noise */
    fprintf(&wire, "%lu,%u,%u.%u\r\n", ms, (unsigned)(1518 + ms / 20 % 5), 31 + warm / 10, warm % 10);
    _delay_ms(17);
  }
}
