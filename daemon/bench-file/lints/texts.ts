/** What stands behind a lint, for `check --explain`: the finding itself says what was found here. */
export interface LintText {
  /** What the lint looks for. */
  readonly what: string;
  readonly why: string;
  readonly do: string;
  /** Where the rule comes from. */
  readonly source: string;
}

export const PRACTICE = "common practice, no source";
export const PHYSICS = "follows from the physics of the part";
export const OWN_RULE = "follows from how this program works";
const SAFETY = "published laser-product safety practice (IEC 60825-1)";

export const lint = (what: string, why: string, advice: string, source: string): LintText => ({
  what,
  why,
  do: advice,
  source,
});

const protection = (what: string, why: string, source = SAFETY): LintText =>
  lint(
    `protections says that the bench has no ${what}`,
    why,
    "add it to the bench in hardware, then state it; the program cannot stand in for it",
    source,
  );

/** Lints on what the bench has in hardware, and on how it speaks with its board. */
export const BENCH_TEXTS = {
  "no-key": protection("key", "without a key anybody lights the laser in passing"),
  "no-interlock-loop": protection(
    "interlock connector",
    "a door or an enclosure must cut light in hardware, whatever software does",
  ),
  "no-emission-warning": protection(
    "warning of emission",
    "whoever is in the room must see that there is light, also through eye protection",
  ),
  "no-beam-stop": protection("beam stop", "light must be able to end without the diode's help"),
  "no-manual-reset": protection(
    "manual reset",
    "a closing door must never bring light back by itself",
  ),
  "no-toggled-enable": protection(
    "toggled enable",
    "a controller that hangs with its pin high keeps the light on; an enable made from a toggled pin ends it in about 100 ms",
    PRACTICE,
  ),
  light: lint(
    "light is something else than continuous",
    "limits here are on the mean current; a pulsed diode has a peak that they do not see",
    "run the diode continuously, or do not use this program for it",
    OWN_RULE,
  ),
  "term-short": lint(
    "the term is shorter than five sample periods",
    "a permit is made from a sample; a few lost samples would end light",
    "write a longer term, or let the board sample faster",
    OWN_RULE,
  ),
  "term-tight": lint(
    "the term is shorter than five permits",
    "permits are at least 50 ms apart, whatever the rate; a term that four lost ones outlast trips on a busy computer",
    "write a longer term, unless the bench needs so short a one",
    OWN_RULE,
  ),
  "term-age": lint(
    "the term is shorter than five permit periods and the worst age of a permit measured on this bench",
    "a permit that arrives old has that much less of its term left: what was measured once comes again",
    "write a longer term, or find out what delays the line",
    OWN_RULE,
  ),
  "wire-up": lint(
    "samples fill more than 60 % of the line",
    "a full line queues, and a queued sample is an old one",
    "write a lower rate of samples, or raise the line rate of board and file",
    OWN_RULE,
  ),
  "wire-down": lint(
    "permits fill more than 30 % of the line",
    "an order to go dark must never wait behind permits",
    "raise the line rate of board and file, or lower the rate of samples",
    OWN_RULE,
  ),
  "slew-fast": lint(
    "the current can rise from zero to its limit between two permits",
    "the judge then sees nothing of the rise before it is over",
    "write a smaller slew-up",
    PRACTICE,
  ),
} as const satisfies Record<string, LintText>;

/** Lints on hazard rows. */
export const HAZARD_TEXTS = {
  "warn-beyond-trip": lint(
    "a row warns at or beyond the level at which it trips",
    "then nobody is warned",
    "write a warning on the safe side of the trip",
    OWN_RULE,
  ),
  "warn-off": lint(
    "a row that warns by default only trips in this file",
    "the first that anybody hears of it is a dark bench",
    "take the line out to have the default back, unless you mean it",
    OWN_RULE,
  ),
  "row-off": lint(
    "a row that trips by default does not in this file",
    "that hazard then goes on until somebody looks",
    "take the line out to have the default back, unless you mean it",
    OWN_RULE,
  ),
  "rate-slow": lint(
    "samples are too rare for a row to meet its safety time",
    "a row needs one to three samples to be sure, and each costs a period",
    "write a higher rate, or a shorter trip-after",
    OWN_RULE,
  ),
  "too-late": lint(
    "a row's trip-after leaves no time for line, judge and fall of the current",
    "the bench would be dark only after its safety time",
    "write a shorter trip-after, or the safety time that the hazard really allows",
    OWN_RULE,
  ),
  "case-trip-high": lint(
    "the case trips at a temperature that is the junction's limit or above it",
    "the junction is always warmer than the case, so its limit is passed first",
    "write a lower trip, or check diode.junction-max",
    PHYSICS,
  ),
  "deadband-small": lint(
    "the deadband of case-over is smaller than one count of its sensor",
    "the warning then comes and goes with every step of the converter",
    "write a deadband of some counts",
    PRACTICE,
  ),
  "recover-small": lint(
    "a cap is lifted by a cooling smaller than the error of the case reading",
    "noise alone then lifts it, and the current swings",
    "write a larger limits.recover",
    PRACTICE,
  ),
  "output-error": lint(
    "the photodiode's error is larger than what output-low is to notice",
    "the row then speaks about the sensor and not about the light",
    "calibrate the photodiode, or write a lower level for the row",
    PRACTICE,
  ),
  unseen: lint(
    "a row has no channel to see its hazard with, unless the board itself tells the unit",
    "a row that sees nothing protects nothing",
    "add the channel with the law of its sensor",
    OWN_RULE,
  ),
} as const satisfies Record<string, LintText>;
