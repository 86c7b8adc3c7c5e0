import { describe, expect, test } from "vitest";
import { HAZARDS } from "../../../daemon/judge/hazards.ts";
import { FLAG, NO_HAZARD, REFUSALS, STATE, type View } from "../../../daemon/judge/records.ts";
import { newOut } from "../../../daemon/judge/state.ts";
import {
  answerWords,
  eventWords,
  nextSentence,
  readBack,
  refusalWords,
  type SentenceNames,
  stateSentence,
} from "../../../daemon/judge/words.ts";
import { HAZARD_IDS } from "../../../daemon/model/bench.ts";
import { CAUSES } from "../../../daemon/model/cause.ts";
import { EVENT_KINDS } from "../../../daemon/model/event.ts";

const north: SentenceNames = { bench: "north", wavelength_nm: 1064, pumped: true };
const bare: SentenceNames = { bench: "bare", wavelength_nm: 808, pumped: false };

const view = (change: Partial<View>): View => ({
  ...newOut().view,
  state: STATE.emitting,
  asked_mA: 1450,
  aim_mA: 1450,
  current_mA: 1452,
  case_degC: 31.26,
  output_mW: 282.4,
  ceiling_mA: 1697,
  floor_mA: 752,
  margin_mA: 700,
  headroom_mA: 245,
  ...change,
});
/** Sentences as they read: the no-break space before a unit is asserted once, below. */
const plain = (text: string): string => text.replaceAll("\u00a0", " ");

describe("what the bench does now", () => {
  test("calm", () => {
    expect(stateSentence(north, view({}), 20)).toBe(
      "north is emitting 1.45\u00a0A as asked; 282\u00a0mW leave at 1064\u00a0nm.",
    );
    expect(plain(nextSentence(north, view({}), 20))).toBe(
      "There is room to 1.69 A; the current is 0.70 A above the crystal's floor.",
    );
    expect(plain(nextSentence(bare, view({}), 20))).toContain("above threshold");
  });

  test("on its way, and without a known output", () => {
    const way = view({ current_mA: 520, output_mW: Number.NaN });
    expect(plain(stateSentence(north, way, 20))).toBe(
      "north is emitting 0.52 A on its way to 1.45 A.",
    );
  });

  test("coming", () => {
    const coming = view({ timeToCap_s: 250 });
    expect(plain(nextSentence(north, coming, 20))).toBe(
      "The case is warming: the ceiling comes down to 1.45 A in about 4 min and then holds the current down.",
    );
    expect(plain(nextSentence(north, view({ timeToCap_s: 20 }), 20))).toContain(
      "less than a minute",
    );
  });

  test("held", () => {
    const held = view({ flags: FLAG.capped, asked_mA: 1800, current_mA: 1610 });
    expect(plain(stateSentence(north, held, 20))).toBe(
      "north is emitting 1.61 A, held down from 1.80 A by its ceiling, the derating for the case; 282 mW leave at 1064 nm.",
    );
    expect(plain(nextSentence(north, held, 20))).toContain("comes back toward 1.80 A by itself");
  });

  test("tripped, and tripped with nobody there", () => {
    const tripped = view({ state: STATE.tripped, cause: 75 });
    expect(stateSentence(north, tripped, 20)).toBe(
      "north went dark because the interlock loop was seen open.",
    );
    expect(nextSentence(north, tripped, 20)).toBe(
      'Walk along the loop: doors, covers, stop buttons. Light stays off until a person resets it, naming "loop", and arms again.',
    );
    const unheard = view({ state: STATE.tripped, cause: 83, flags: FLAG.unheard });
    expect(stateSentence(north, unheard, 99_000)).toContain("No controller answers now");
  });

  test("silent", () => {
    expect(plain(stateSentence(north, view({ current_mA: 1640 }), 34_000))).toBe(
      "Nothing heard from north for 34 s. It last said 1.64 A; whether it is dark is not known here.",
    );
  });

  test("offline, standby, armed", () => {
    expect(stateSentence(north, view({ state: STATE.offline }), 1e9)).toBe(
      "No controller answers for north.",
    );
    const standby = view({ state: STATE.standby, asked_mA: Number.NaN, current_mA: 0 });
    expect(stateSentence(north, standby, 20)).toBe("north is dark and ready.");
    expect(plain(nextSentence(north, standby, 20))).toContain("1.69 A");
    const armed = view({ state: STATE.armed, current_mA: 0, delayLeft_ms: 2400 });
    expect(plain(stateSentence(north, armed, 20))).toBe(
      "north is armed for 1.45 A; light comes in 3 s.",
    );
    expect(stateSentence(north, view({ state: STATE.armed, asked_mA: 0 }), 20)).toBe(
      "north is armed at zero current.",
    );
  });
});

describe("refusals and answers", () => {
  test("a current above the ceiling names the highest that is not refused", () => {
    expect(plain(refusalWords("above-ceiling", 1920, 1697, view({})))).toBe(
      "1.92 A is above the ceiling, 1.69 A just now (the derating for the case). Ask for 1.69 A or less.",
    );
  });

  test("a standing trip is named with the word to type", () => {
    expect(refusalWords("wrong-cause", 0, 64, view({}))).toBe(
      'The bench is dark because the case passed its limit. Reset it by naming "case-over".',
    );
  });

  test("every refusal is a sentence", () => {
    for (const refusal of REFUSALS) {
      expect(refusalWords(refusal, 1000, 64, view({}))).toMatch(/^[A-Z0-9].*\.$/);
    }
  });

  test("answers", () => {
    expect(plain(answerWords("north", "arm", 1450, view({})))).toContain("armed for 1.45 A");
    expect(plain(answerWords("north", "set", 1200, view({})))).toBe("north goes to 1.20 A.");
    expect(answerWords("north", "dark", 0, view({ state: STATE.standby }))).toBe(
      "north is ordered dark.",
    );
    expect(answerWords("north", "dark", 0, view({ state: STATE.tripped, cause: 2 }))).toContain(
      "stays tripped because the host's permit ran out",
    );
  });

  test("a typed current is read back with what it would give", () => {
    expect(plain(readBack(north, 1450, 282, view({})))).toBe(
      "1.45 A gives about 282 mW at 1064 nm, with 0.25 A of room to the ceiling. Light comes some seconds after arming; wear eyewear first.",
    );
    expect(plain(readBack(north, 1750, 400, view({})))).toContain("above the ceiling");
  });
});

describe("events", () => {
  test("a trip names cause, value and limit", () => {
    const told = eventWords("trip", 64, 50.04, 50);
    expect(told.weight).toBe("trip");
    expect(plain(told.words)).toBe(
      "Dark: the case passed its limit: 50.0 °C, and 50.0 °C is its limit.",
    );
    expect(plain(eventWords("trip", 2, 1450, 31.2).words)).toBe(
      "Dark: the host's permit ran out; 1.45 A flowed and the case was at 31.2 °C.",
    );
    expect(eventWords("trip", 74, 1, 1).words).toBe("Dark: the key was seen off.");
    expect(eventWords("trip", 84, Number.NaN, Number.NaN).words).toBe(
      "Dark: the daemon had stopped while the bench was armed.",
    );
  });

  test("a warning names what nears, its value and its level; its end is calm", () => {
    const row = -1 - HAZARD_IDS.indexOf("margin-low");
    expect(plain(eventWords("warning", row, 0.251, 0.3).words)).toBe(
      "The current is near the floor: 25.1 %, and 30.0 % is where it warns.",
    );
    expect(plain(eventWords("warning", 64, 42.3, 42).words)).toBe(
      "The case is warm: 42.3 °C, and 42.0 °C is where it warns.",
    );
    expect(plain(eventWords("warning-over", 64, 39.9, 42).words)).toBe(
      "No longer: the case is warm; now 39.9 °C.",
    );
    expect(eventWords("warning-over", 64, 39.9, 42).weight).toBe("calm");
  });

  test("the end of a gap tells how long it was, which is no value of now", () => {
    expect(plain(eventWords("warning-over", 71, 204, 125).words)).toBe(
      "Samples come again, after 204 ms without one.",
    );
  });

  test("the others", () => {
    expect(plain(eventWords("capped", NO_HAZARD, 1800, 1618).words)).toBe(
      "Held down from 1.80 A by the ceiling, 1.61 A.",
    );
    expect(plain(eventWords("set", NO_HAZARD, 1200, 1000).words)).toBe(
      "1.20 A asked instead of 1.00 A.",
    );
    expect(plain(eventWords("set", NO_HAZARD, 1200, 1200).words)).toBe("1.20 A asked once more.");
    expect(eventWords("dark", 0, 1450, 31).words).toBe("Dark: a person asked for dark.");
    expect(eventWords("refused", NO_HAZARD, REFUSALS.indexOf("key-off"), 0).words).toBe(
      "Refused: the key is off.",
    );
  });

  test("every kind and cause has words that read as a sentence, without exclamation", () => {
    const hazards = [NO_HAZARD, ...CAUSES.map((c) => c.code), ...HAZARDS.map((_, i) => -1 - i)];
    for (const kind of EVENT_KINDS) {
      for (const hazard of hazards) {
        const { words } = eventWords(kind, hazard, 0, 0.5);
        expect(words).toMatch(/^[A-Z0-9].*\.$/);
        expect(words).not.toMatch(/!|please|error|undefined|NaN|roof/i);
      }
    }
  });

  test("every row of the table tells what it means and where to look", () => {
    for (const row of HAZARDS) {
      expect(row.meaning).toMatch(/^[A-Z].*\.$/);
      expect(row.look).toMatch(/^[A-Z].*\.$/);
      expect(row.reason).toMatch(/^[a-z].*[a-z]$/);
    }
    expect(HAZARDS.map((row) => row.id)).toEqual([...HAZARD_IDS]);
  });

  test("a row and the cause of its trip say the same", () => {
    for (const row of HAZARDS) {
      const cause = CAUSES.find((c) => c.code === row.cause);
      if (row.cause >= 0) expect(row.reason).toBe(cause?.words);
    }
  });
});
