/*
 * What is burnt into this board. Another sensor, sense resistor or diode is another set of numbers
 * here; README.md says where each comes from. Counts of the set channel are 2 mA each.
 */
#ifndef BOARD_FACTS_H
#define BOARD_FACTS_H

#include "converter.h"

/* Set on the make line for each board: SERIAL=... BANDGAP_MV=... MAINS_HZ=... */
#ifndef BOARD_SERIAL
#define BOARD_SERIAL "ATMEGA-1"
#endif
#ifndef BANDGAP_MV
#define BANDGAP_MV 1100u /* data sheet: 1000 … 1200; measure it, README.md says how */
#endif

/* 1000 counts are 2.0 A, under the 2.2 A absolute maximum of the diode the board was made for. */
#define ABSOLUTE_COUNTS 1000u
#define SLEW_COUNTS_PER_S 1000u /* upward; 2 A/s */

/* Filter 2 ms: from 2.0 A to 5 mA in 12 ms; rounded up. */
#define FALL_MS 20u

/* Sense amplifier 2 V/A, converter 5 V / 16384: 0.152588 mA a count of current. A count of set is
 * 2 mA = 13.1072 counts of current = 367 / 28. */
#define CURRENT_NUM 367u
#define CURRENT_DEN 28u
#define DARK_CURRENT_COUNTS 131u /* 20 mA */

/* Thermistor 10 kOhm, beta 3950 K, to ground; 10 kOhm to the supply; 1 MOhm bleed. */
#define CASE_OVER_COUNTS 4315   /* 50 degC: 3588 Ohm, 3575 with the bleed */
#define CASE_OPEN_COUNTS 15700  /* -33 degC; an open sensor reads 16222 through the bleed */
#define CASE_SHORT_COUNTS 300   /* 150 degC */
#define CASE_FAULT_MS 100u

#define SUPPLY_LOW_MV 4500
#define SUPPLY_HIGH_MV 5500

/* At least five sample periods, and 150 ms. */
#if MAINS_HZ == 50
#define TERM_MIN_MS 150u
#else
#define TERM_MIN_MS 250u
#endif
#define TERM_MAX_MS 10000u

#endif
