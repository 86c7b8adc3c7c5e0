#include "start.h"

#include <avr/io.h>
#include <avr/wdt.h>

uint8_t start_flags __attribute__((section(".noinit")));

void startEarly(void) __attribute__((naked, used, section(".init3")));

/* A watchdog that has just bitten runs on with 16 ms. It resets and nothing else (no interrupt
 * mode), and is never switched off. */
void startEarly(void) {
  start_flags = MCUSR;
  MCUSR = 0;
  wdt_enable(WDTO_500MS);
  wdt_reset(); /* the longer time counts from here */
}
