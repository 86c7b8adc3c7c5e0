import { HAZARD_IDS, type HazardId } from "../model/bench.ts";
import { HAZARD_ROWS } from "../model/hazard-rows.ts";
import * as detect from "./detect.ts";
import type { Plan } from "./plan.ts";
import type { State } from "./state.ts";

/**
 * The table of hazards: one row is all there is to know of one. The order is the order of judging:
 * where two rows would trip on one sample, the earlier one is the first-out. Levels, delays and
 * deadbands come from the bench file; what is compared with them stands in model/hazard-rows.ts.
 */
export interface Hazard {
  readonly id: HazardId;
  /** Cause code of its trip; −1 for a row that only warns. */
  readonly cause: number;
  /** Writes this row's values of warn and trip into the state; NaN where it says nothing now. */
  readonly measure: (plan: Plan, state: State, row: number) => void;
  /** While which the row may trip: a session, any connected state, or never by the host's sample. */
  readonly trips: "lit" | "connected" | "elsewhere" | "never";
  /** Whether the reading behind a permit is in doubt from the first sample beyond the trip level. */
  readonly doubt: boolean;
  /** Who acts on it. */
  readonly who: "host" | "board and host" | "board";
  /** Completes "north went dark because …"; what it means; what to look at first. */
  readonly reason: string;
  readonly meaning: string;
  readonly look: string;
}

type Words = readonly [reason: string, meaning: string, look: string];
type Acts = Pick<Hazard, "cause" | "trips" | "who"> & { readonly doubt?: boolean };

const hazard = (id: HazardId, acts: Acts, measure: Hazard["measure"], words: Words): Hazard => ({
  id,
  doubt: false,
  ...acts,
  measure,
  reason: words[0],
  meaning: words[1],
  look: words[2],
});

const lit = "lit" as const;
const host = "host" as const;
const both = "board and host" as const;

const TABLE: readonly Hazard[] = [
  hazard("over-ceiling", { cause: 65, trips: lit, who: both, doubt: true }, detect.overCeiling, [
    "measured current passed the ceiling",
    "The output stage gave more than it was allowed: it, its sense resistor or the converter's reference has moved.",
    "Look at the output stage and its sense resistor before any light.",
  ]),
  hazard("follow-high", { cause: 66, trips: lit, who: both }, detect.followHigh, [
    "current ran above its aim",
    "The stage gave more than the board set, still under the ceiling.",
    "Compare a second current meter with what the board reads.",
  ]),
  hazard("follow-low", { cause: 67, trips: lit, who: host }, detect.followLow, [
    "current ran below its aim",
    "The stage could not drive the diode: supply too low, a lead open, or a connector with resistance.",
    "Look at the supply and the diode's leads.",
  ]),
  hazard("case-over", { cause: 64, trips: lit, who: both }, detect.caseOver, [
    "the case passed its limit",
    "Heat no longer leaves as it should, or the room is too warm.",
    "Look at the fan, the sink and the air round it.",
  ]),
  hazard("case-open", { cause: 68, trips: lit, who: both, doubt: true }, detect.caseDivider, [
    "the case sensor reads open",
    "The temperature of the case is not known, so no current is safe.",
    "Look at the sensor's lead and connector.",
  ]),
  hazard("case-short", { cause: 69, trips: lit, who: both, doubt: true }, detect.caseDivider, [
    "the case sensor reads shorted",
    "The temperature of the case is not known, so no current is safe.",
    "Look at the sensor's lead and connector.",
  ]),
  hazard("sensor-range", { cause: 70, trips: lit, who: host, doubt: true }, detect.sensorRange, [
    "a sensor reads outside its range",
    "A channel gives counts that its converter cannot give.",
    "Look at the raw lines and at the board's supply.",
  ]),
  hazard("sample-gap", { cause: 71, trips: "elsewhere", who: both }, detect.nothing, [
    "samples stopped arriving",
    "The board, the cable or this computer stood still for longer than the permit's term.",
    "Look at the cable and at what else this computer was doing.",
  ]),
  hazard("tick-drift", { cause: 72, trips: lit, who: host }, detect.tickDrift, [
    "the board's clock and this computer's disagree",
    "The term of a permit is counted by the board's clock, so that clock must be right.",
    "Look at the board's oscillator; look whether this computer's clock was stepped.",
  ]),
  hazard("controller-reset", { cause: 73, trips: "elsewhere", who: both }, detect.nothing, [
    "the board reset itself",
    "Its supply dipped, its watchdog ended a hung loop, or its reset line was pulled.",
    "Look at the board's supply and at what switched on near it.",
  ]),
  hazard("key", { cause: 74, trips: lit, who: both }, detect.key, [
    "the key was seen off",
    "Somebody turned the key, or its contact is failing.",
    "Find out who turned it.",
  ]),
  hazard("loop", { cause: 75, trips: lit, who: both }, detect.loop, [
    "the interlock loop was seen open",
    "A door, cover or stop button in the loop opened.",
    "Walk along the loop: doors, covers, stop buttons.",
  ]),
  hazard("dark-current", { cause: 79, trips: "connected", who: both }, detect.darkCurrent, [
    "current was seen while the bench was dark",
    "Current flows that nobody asked for: the pass transistor may be shorted.",
    "Cut the supply of the output stage and measure there.",
  ]),
  hazard("dark-light", { cause: 78, trips: "connected", who: host }, detect.darkLight, [
    "light was seen while the bench was dark",
    "The photodiode sees light without current: lamp light, or a laser that should be off.",
    "Wear eyewear, then cover the detector.",
  ]),
  hazard("output-low", { cause: 77, trips: lit, who: host }, detect.outputLow, [
    "output was lost while current flowed",
    "The light fell well below what this current should give; its power now heats the bench.",
    "Look at the alignment and at the crystal's or diode's temperature.",
  ]),
  hazard("margin-low", { cause: -1, trips: "never", who: host }, detect.marginLow, [
    "the current is near the floor",
    "A little more warmth or wear and the light goes out. Nothing is damaged by it.",
    "Cool the case, or ask for more current if the ceiling allows it.",
  ]),
  hazard("permit-age", { cause: -1, trips: "never", who: "board" }, detect.permitAge, [
    "permits reach the board late",
    "If they come later than their term, the board goes dark by itself.",
    "Look at what else this computer does, and at the cable.",
  ]),
  hazard("curve-differs", { cause: 80, trips: lit, who: host }, detect.curveDiffers, [
    "the board's curve is not the one this bench file makes",
    "The board would not limit the current by this bench file.",
    "Reconnect, so that the curve is loaded anew.",
  ]),
  hazard("dark-time", { cause: 86, trips: lit, who: host }, detect.darkTime, [
    "it stood armed at zero current longer than the bench file allows",
    "Somebody armed it and left it without light.",
    "Nothing is wrong with the bench.",
  ]),
  hazard("link-lost", { cause: 83, trips: "elsewhere", who: both }, detect.nothing, [
    "the port was lost while armed",
    "The cable was pulled, the adapter failed or the board lost its supply.",
    "Look at the cable and the board's lamp.",
  ]),
];

/** All rows, in the order of HAZARD_IDS. */
export const HAZARDS: readonly Hazard[] = TABLE;

/** Index of a row in every array that has one entry a row. */
export const rowOf = (id: HazardId): number => HAZARD_IDS.indexOf(id);

const byCause = new Map(TABLE.filter((row) => row.cause >= 0).map((row) => [row.cause, row]));

/** The row whose trip has this cause code, or undefined. */
export const hazardOfCause = (cause: number): Hazard | undefined => byCause.get(cause);

/** How an event names a row: the cause of its trip, or −1 − index for a row that only warns. */
export const eventHazardOf = (row: number): number => {
  const cause = HAZARDS[row]?.cause ?? -1;
  return cause >= 0 ? cause : -1 - row;
};

/** By row: 1 where danger lies above the level, −1 where below. */
export const SIGN = Int8Array.from(HAZARD_IDS, (id) =>
  HAZARD_ROWS[id].danger === "above" ? 1 : -1,
);
/** By row: samples that must agree before it trips. */
export const SAMPLES = Int8Array.from(HAZARD_IDS, (id) => HAZARD_ROWS[id].samples);
