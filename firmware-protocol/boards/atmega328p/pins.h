/*
 * Which pin of the ATmega328P does what. Plain numbers only, so that the firmware and the
 * simulator's runner read the same table; README.md of this folder draws the wiring.
 */
#ifndef BOARD_PINS_H
#define BOARD_PINS_H

/* Port B. */
#define PIN_ENABLE 0    /* PB0: toggled once a pass into the one-shot while light is allowed */
#define PIN_DRIVE 1     /* PB1, OC1A: pulse width is the set current; an input (floating) at zero */

/* Port D. PD0 and PD1 are the serial port. Inputs have pull-ups and close to ground. */
#define PIN_KEY 6       /* PD6: low is on */
#define PIN_LOOP 7      /* PD7: low is closed */
#define PIN_BUTTON 4    /* PD4: low is pressed */
#define PIN_INDICATOR 5 /* PD5: high lights the emission indicator */

/* Converter channels (port C). */
#define ADC_CURRENT 0
#define ADC_CASE 1
#define ADC_PHOTODIODE 2
#define ADC_FORWARD 3
#define ADC_SINK 4
#define ADC_BANDGAP 14
#define ADC_GROUND 15

#endif
