/*
 * What a board gives the controller core: one table of fixed facts and one struct of port functions.
 * The core touches hardware through these alone, owns no memory and keeps no global state, so that
 * one process can run any number of boards.
 *
 * On AVR the constant tables stay in flash (CORE_FLASH is the compiler's named address space, so
 * compile with -std=gnu99 there); everywhere else CORE_FLASH is empty and plain C99 is enough.
 */
#ifndef BEAMSITTER_BOARD_H
#define BEAMSITTER_BOARD_H

#include <stdint.h>

#ifdef __AVR__
#define CORE_FLASH __flash
#else
#define CORE_FLASH
#endif

/** Index of a judge's channel that this board does not have. */
#define CORE_NO_CHANNEL 255u

/** Bytes of non-volatile memory the core uses, from address 0. */
#define CORE_NV_BYTES 128u

/** Why the processor started, for core_init. */
enum core_reset { CORE_POWER = 0, CORE_BROWN_OUT, CORE_WATCHDOG, CORE_EXTERNAL, CORE_UNKNOWN };

/** One channel of the manifest. Group 0 travels in every sample, groups 1 to 15 in turn. */
struct core_channel {
  char name[13]; /* word of at most 12 characters, see PROTOCOL.md */
  char unit[9];  /* a-zA-Z%/ of at most 8 characters */
  uint16_t mantissa;
  int8_t exponent; /* unit per count = mantissa times ten to this power, -12 to 6 */
  int32_t min;     /* smallest count the converter can give */
  int32_t max;     /* largest count the converter can give */
  uint8_t group;
};

/** What is burnt into the board. Counts are those of the channel named. */
struct core_board {
  char firmware[21]; /* word of at most 20 characters, with its version */
  char serial[13];   /* A-Z 0-9 -, at most 12 characters */
  char caps[41];     /* capability words joined by commas, or "-" */
  uint16_t tick_us;  /* 100 to 10000 */
  uint16_t absolute; /* highest drive ever, counts of set */
  uint16_t term_min; /* ticks */
  uint16_t term_max; /* ticks, at most 32767: the ring keeps 16 bits of a sample's tick */
  uint16_t fall_ms;  /* from full current to dark of the output stage */
  uint16_t rate_perS;

  const CORE_FLASH struct core_channel *channels; /* index ascending, channel_count of them */
  uint8_t channel_count;                          /* 1 to 64 */
  uint8_t anchor_every;                           /* every how many samples one is an anchor, 1 up */

  /* Which channels the core judges, as indexes; CORE_NO_CHANNEL where optional and absent. */
  uint8_t set;
  uint8_t current;
  uint8_t case_;
  uint8_t supply; /* optional */

  /* Counts of current = counts of set times current_num / current_den. Both at most 1000. */
  uint16_t current_num;
  uint16_t current_den;
  uint8_t current_step; /* counts between neighbouring values of one unaveraged conversion; 1 up */

  /* The divider's reading of the case sensor. */
  uint8_t case_warm_is_low; /* 1: an NTC to ground, the count falls as the case warms */
  int32_t case_over;        /* at this count or warmer the case is over its limit */
  int32_t case_open;        /* at this count or above the sensor is open */
  int32_t case_short;       /* at this count or below the sensor is shorted */
  uint16_t case_fault_ms;   /* open or short this long (or 5 readings) is a trip */

  int32_t supply_low;  /* at this count or below the supply is low */
  int32_t supply_high; /* at this count or above the supply is high */
  uint16_t supply_ms;

  uint16_t dark_current; /* counts of current that may not flow while dark, 20 mA's worth */
  uint16_t dark_current_ms;
  uint16_t follow_ms; /* current 5 % (or a quarter of dark_current) above its aim: a trip */
  uint16_t converter_stop_ms; /* no conversion this long, while armed, is a trip */

  uint16_t emission_delay_ms; /* 3000 to 5000 */
  uint16_t slew_countsPerS;   /* upward only, counts of set */
  uint8_t inject;             /* 1: proof injections are offered (the word stands in caps too) */
};

/**
 * The port. Every function returns at once: none waits for hardware. Interrupts may call cut only
 * (through core_byte, core_break, core_conversion, core_inputs); all others are called from the
 * main loop, inside core_init, core_reading and core_pass.
 */
struct core_port {
  void *ctx;

  /**
   * Drives the output stage, counts of set; called once a pass. Zero means off, truly (disconnect a
   * PWM pin). After cut, every call but set_drive(ctx, 0) is ignored until set_drive(ctx, 0) came:
   * an interrupt that cuts between the core's sum and this call must win.
   */
  void (*set_drive)(void *ctx, uint16_t counts);

  /** Output stage off at once; legal in an interrupt; holds until the next set_drive(ctx, 0). */
  void (*cut)(void *ctx);

  /** Last act of each whole pass: kicks the watchdog, and toggles the enable line if enabled is 1. */
  void (*alive)(void *ctx, uint8_t enabled);

  /** The emission indicator; called on a change only. */
  void (*indicator)(void *ctx, uint8_t on);

  /**
   * Queues one whole line (its LF included) for the host, all of it or nothing. Returns length when
   * queued and 0 when there was no room. With length 0 it queues nothing and returns the free room
   * in bytes. The queue must hold at least 162 bytes.
   */
  uint16_t (*send)(void *ctx, const uint8_t *bytes, uint16_t length);

  /** A byte of non-volatile memory, 0 to 255; -1 while a write is under way; -2 if unreadable. */
  int16_t (*nv_read)(void *ctx, uint16_t address);

  /** Starts the write of one byte and returns 0, or returns 1 (nothing begun) while one is under way. */
  uint8_t (*nv_write)(void *ctx, uint16_t address, uint8_t byte);

  /** Some bits that differ from time to time (noise of a converter, a free timer). Any value is legal. */
  uint32_t (*jitter)(void *ctx);
};

#endif
