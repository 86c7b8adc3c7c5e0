import {
  BENCH_TEXTS,
  HAZARD_TEXTS,
  type LintText,
  lint,
  OWN_RULE,
  PHYSICS,
  PRACTICE,
} from "./texts.ts";

/** Lints on currents and limits. */
const CURRENT_TEXTS = {
  "over-absolute": lint(
    "a limit lies above the diode's absolute maximum",
    "the data sheet promises damage there",
    "write the absolute maximum or less",
    "the diode's data sheet",
  ),
  "no-room-for-clamp": lint(
    "no room is left under the absolute maximum for a hardware clamp at 110 % of the limit",
    "what is faster than 10 ms is beyond every program: only hardware catches it",
    "write a lower limits.current",
    PRACTICE,
  ),
  "derating-order": lint(
    "points of the derating are not in order of their temperature",
    "a line between them has no meaning then",
    "put the points in order, each temperature once",
    OWN_RULE,
  ),
  "derating-rises": lint(
    "the derating allows more current to a warmer case",
    "a diode bears less as it warms",
    "write no more than the point before",
    PHYSICS,
  ),
  "derating-ends-early": lint(
    "the derating ends below the temperature at which case-over trips",
    "beyond the last point no current is allowed: light ends there, and the row never speaks",
    "add a point at the trip's temperature, or lower the trip",
    OWN_RULE,
  ),
  "limit-idle": lint(
    "limits.current lies above the whole derating",
    "it then limits nothing, and whoever reads it believes a wrong number",
    "write the largest current of the derating or less",
    OWN_RULE,
  ),
  "under-threshold": lint(
    "the ceiling lies below threshold",
    "below threshold there is no laser light",
    "check derating, limits.current and diode.threshold for a wrong unit",
    PHYSICS,
  ),
  "crystal-dark": lint(
    "the crystal does not lase under the ceiling",
    "the bench could never do its work",
    "check crystal.threshold, crystal.line and diode.wavelength against each other",
    PHYSICS,
  ),
  "junction-first": lint(
    "the junction's limit lies under the derating",
    "the junction then makes the ceiling, counting all power as heat",
    "write a lower derating, or leave it so",
    PHYSICS,
  ),
  hunts: lint(
    "the derating falls so steeply that a capped current swings instead of settling",
    "less current cools the case, a cooler case allows more current: above a gain of one this does not die out",
    "spread the fall over more kelvin, or cool the case better",
    "loop gain above one, as in any control loop",
  ),
  "cooling-weak": lint(
    "at the limit and in a room of 25 °C the case settles where it trips",
    "the limit can then not be held",
    "cool better, or write a lower limits.current",
    PHYSICS,
  ),
} as const satisfies Record<string, LintText>;

/** Lints on the laws of diode and crystal. */
const LAW_TEXTS = {
  "efficiency-impossible": lint(
    "diode.slope and diode.voltage make more light than there is electrical power",
    "no diode does that: one of the numbers is wrong, and limits are made from them",
    "check slope, voltage and resistance for a wrong unit, and the power meter's calibration",
    PHYSICS,
  ),
  efficiency: lint(
    "the diode would turn less than 10 % or more than 75 % of its electrical power into light",
    "30 to 40 % is usual; far from it suspect a unit or a calibration",
    "check diode.slope, diode.voltage and diode.resistance",
    PRACTICE,
  ),
  "beyond-quantum": lint(
    "a slope is steeper than one photon for each electron, or for each pump photon",
    "energy and number of photons are conserved",
    "check the slope's unit, the wavelengths and the power meter's calibration",
    "photon energy h·c/λ (SI definitions of h, c and e)",
  ),
  "voltage-under-photon": lint(
    "the forward voltage at the limit is lower than the energy of one photon",
    "an electron cannot give more energy than the voltage gave it",
    "check diode.voltage, diode.resistance and diode.wavelength",
    "photon energy h·c/λ (SI definitions of h, c and e)",
  ),
  "t1-under-t0": lint(
    "the slope falls faster with temperature than threshold rises",
    "most diodes do the opposite; often the two were swapped",
    "check diode.threshold-t0 and diode.slope-t1 against the data sheet",
    PRACTICE,
  ),
  "reference-far": lint(
    "diode.at lies more than 40 K outside the derating",
    "threshold and slope are then carried far by an exponential law",
    "take threshold and slope at a temperature that the bench reaches",
    PRACTICE,
  ),
  "crystal-upconverts": lint(
    "the crystal's light has a shorter wavelength than its pump",
    "one pump photon cannot give a photon of more energy",
    "check crystal.wavelength and diode.wavelength",
    "photon energy h·c/λ (SI definitions of h, c and e)",
  ),
  "pump-off-line": lint(
    "the pump passes the crystal's absorption line by at every temperature of the derating",
    "most of the pump light then leaves the crystal unused, and reaches the photodiode",
    "check diode.wavelength, crystal.line, crystal.line-width and crystal.pump-drift",
    PHYSICS,
  ),
} as const satisfies Record<string, LintText>;

/** Lints on sensors and their conversions. */
const SENSOR_TEXTS = {
  thermistor: lint(
    "the constants of a thermistor give nonsense",
    "a wrong constant is a wrong temperature, and the ceiling follows it",
    "take the constants from the thermistor's data sheet, for ohm and kelvin",
    PRACTICE,
  ),
  "self-heating": lint(
    "a sensor is warmed by its own divider beyond its stated error",
    "it then reads its own heat",
    "power the divider only while it is read, use larger resistors, or state a larger error",
    "V²/(R·δ), the dissipation constant δ of the sensor's data sheet",
  ),
  "sensor-span": lint(
    "at the trip level the case sensor reads like an open or shorted one",
    "a case too warm would be told as a broken wire, or not at all",
    "choose a fixed resistor nearer to the sensor's resistance there",
    PHYSICS,
  ),
  "sensor-span-cold": lint(
    "at the coolest point of the derating the case sensor reads like an open or shorted one",
    "a cold morning would trip the bench as a broken wire",
    "choose a fixed resistor nearer to the sensor's resistance there",
    PHYSICS,
  ),
  "sensor-coarse": lint(
    "one count of the case sensor is more than half a kelvin near the trip",
    "what happens near the trip is then hidden in the steps",
    "choose another fixed resistor, or let the board add readings",
    PRACTICE,
  ),
  "steps-coarse": lint(
    "the steps of a converter are too coarse for the limits: two of them are more than a row is to notice",
    "the row then waits for steps, not for the hazard",
    "use a converter with more bits, a smaller range, or let the board add readings",
    OWN_RULE,
  ),
  "error-large": lint(
    "the stated error of the case reading is larger than the distance from warning to trip",
    "the warning then says nothing that the trip does not",
    "calibrate the sensor, or move warning and trip apart",
    PRACTICE,
  ),
} as const satisfies Record<string, LintText>;

/** Every lint by its code, which never changes. A finding cannot have a code that is not here. */
export const LINTS = {
  ...BENCH_TEXTS,
  ...CURRENT_TEXTS,
  ...LAW_TEXTS,
  ...SENSOR_TEXTS,
  ...HAZARD_TEXTS,
} as const satisfies Record<string, LintText>;
export type LintCode = keyof typeof LINTS;
