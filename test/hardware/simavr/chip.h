/*
 * The simulated microcontroller: loads the firmware, lets it run for a number of cycles, and
 * carries what goes in and out of its pins. One chip a process, so its state is one struct.
 */
#ifndef CHIP_H
#define CHIP_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "plant.h"

#define CPU_HZ 16000000u
#define PLANT_CYCLES 1600u /* The plant steps every 0.1 ms. */
#define CYCLES_A_MS (CPU_HZ / 1000u)

/* What the runner wants to know of; each is called with the cycle at which it happened. */
struct chip_events {
  void (*sent)(uint64_t cycle, uint8_t byte);
  void (*reset)(uint64_t cycle);
  void (*output)(uint64_t cycle); /* drive, stage or indicator changed: read them from chip */
};

struct chip {
  uint16_t drive;   /* counts of OCR1A that reach the pin, 0 while it is disconnected */
  bool stage;       /* the one-shot behind the enable pin holds the output stage on */
  bool indicator;
  bool lit;         /* current above plant's DARK_MA */
  uint32_t edges;   /* of the enable pin since the start */
  bool key, loop, button;
  uint32_t oneShot_ms; /* how long the one-shot holds after an edge */
  struct plant plant;
};

extern struct chip chip;

/* Loads an ELF file; on failure says why on stderr and returns false. */
bool chip_load(const char *elfPath, const struct chip_events *events);

/* Puts one byte on the receive wire, after all bytes put before it. False when the queue is full. */
bool chip_receive(uint8_t byte, bool isBreak);

/* Runs until `cycle` has been reached, or, when `stopAtLine`, a line end was sent. */
void chip_run(uint64_t cycle, bool stopAtLine);

uint64_t chip_cycle(void);

/* Resets the chip as `kind` (power, brown-out, external, watchdog) would. Memory that a loss of
 * power clears is filled with a pattern. False for an unknown kind. */
bool chip_reset(const char *kind);

/* Finds a symbol of the ELF file: data addresses without the 0x800000 offset, code in bytes. */
bool chip_symbol(const char *name, uint32_t *address, bool *isData);

uint8_t *chip_ram(uint32_t address, size_t length);   /* NULL outside the memory */
uint8_t *chip_flash(uint32_t address, size_t length); /* NULL outside the memory */
uint8_t *chip_eeprom(size_t *length);

/* Bytes of stack used at the deepest since the memory was last filled. */
uint32_t chip_stack(void);

/* Replaces the instruction at a symbol by a jump to itself: a hung program. `chip_mend` undoes it. */
bool chip_hang(const char *symbol);
void chip_mend(void);

#endif
