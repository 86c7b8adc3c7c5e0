/*
 * A small bench round the chip: output stage, diode, thermistor, photodiode. Only what the wiring
 * in the board's README says, so that the firmware's own scales are checked against it.
 */
#ifndef PLANT_H
#define PLANT_H

#include <stdbool.h>
#include <stdint.h>

#define PLANT_INPUTS 5
#define DARK_MA 5.0 /* Below this the output counts as dark. */

struct plant {
  double filtered_mA; /* what the drive filter asks of the current regulator */
  double current_mA;
  double case_degC;
  bool caseHeld;      /* the case stays where it was put */
  double ambient_degC;
  double hum_mV, hum_Hz; /* amplitude and rate of mains pick-up on the case sensor's wire */
  uint32_t steps;        /* of 0.1 ms, since the start */
  int32_t forced_mV[PLANT_INPUTS]; /* a reading put in by hand, or -1 */
  uint32_t input_mV[PLANT_INPUTS]; /* what the converter's pins see */
};

void plant_init(struct plant *plant);

/* One step of 0.1 ms. `drive` is the pulse width (0 … 1023), `stage` whether the gate is open. */
void plant_step(struct plant *plant, uint16_t drive, bool stage);

#endif
