#include "plant.h"

#include <math.h>

#include "pins.h"

#define STEP_MS 0.1
#define FILTER_MS 2.0       /* drive filter of the board's README */
#define DRIVE_MA_COUNT 2.0  /* 1023 counts are 2046 mA */
#define SENSE_MV_MA 2.0     /* sense amplifier: 2 V per ampere */
#define THRESHOLD_MA 400.0
#define SLOPE_W_MA 1.05e-3
#define PHOTODIODE_MV_W 2000.0
#define FORWARD_MV 1500.0
#define FORWARD_MV_MA 0.19
#define THERMAL_K_W 9.0
#define THERMAL_MS 20000.0  /* a small mount: warms within a minute */
#define SUPPLY_MV 5000.0

/* Divider of the board's README: 10 kOhm to the supply; thermistor and 1 MOhm bleed to ground. */
static uint32_t thermistor_mV(double case_degC) {
  const double ntc = 10e3 * exp(3950.0 * (1.0 / (case_degC + 273.15) - 1.0 / 298.15));
  const double lower = 1.0 / (1.0 / ntc + 1.0 / 1e6);
  return (uint32_t)(SUPPLY_MV * lower / (lower + 10e3) + 0.5);
}

static double light_W(double current_mA) {
  return current_mA > THRESHOLD_MA ? (current_mA - THRESHOLD_MA) * SLOPE_W_MA : 0.0;
}

static uint32_t bounded_mV(double value) {
  return value < 0.0 ? 0u : value > SUPPLY_MV ? (uint32_t)SUPPLY_MV : (uint32_t)(value + 0.5);
}

void plant_init(struct plant *plant) {
  *plant = (struct plant){.case_degC = 25.0, .caseHeld = true, .ambient_degC = 24.0};
  for (int n = 0; n < PLANT_INPUTS; n++) plant->forced_mV[n] = -1;
}

void plant_step(struct plant *plant, uint16_t drive, bool stage) {
  plant->filtered_mA += (drive * DRIVE_MA_COUNT - plant->filtered_mA) * (STEP_MS / FILTER_MS);
  plant->current_mA = stage ? plant->filtered_mA : 0.0;

  const double light = light_W(plant->current_mA);
  const double forward = FORWARD_MV + plant->current_mA * FORWARD_MV_MA;
  if (!plant->caseHeld) {
    const double heat_W = forward * plant->current_mA * 1e-6 - light;
    const double settled = plant->ambient_degC + heat_W * THERMAL_K_W;
    plant->case_degC += (settled - plant->case_degC) * (STEP_MS / THERMAL_MS);
  }

  plant->input_mV[ADC_CURRENT] = bounded_mV(plant->current_mA * SENSE_MV_MA);
  const double phase = 2.0 * M_PI * plant->hum_Hz * plant->steps++ * STEP_MS * 1e-3;
  plant->input_mV[ADC_CASE] =
      bounded_mV(thermistor_mV(plant->case_degC) + plant->hum_mV * sin(phase));
  plant->input_mV[ADC_PHOTODIODE] = bounded_mV(light * PHOTODIODE_MV_W);
  plant->input_mV[ADC_FORWARD] = bounded_mV(plant->current_mA > DARK_MA ? forward : 0.0);
  plant->input_mV[ADC_SINK] = thermistor_mV(plant->ambient_degC);
  for (int n = 0; n < PLANT_INPUTS; n++) {
    if (plant->forced_mV[n] >= 0) plant->input_mV[n] = (uint32_t)plant->forced_mV[n];
  }
}
