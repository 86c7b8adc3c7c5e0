import { describe, expect, test } from "vitest";
import { readBack, typedCurrent } from "../../../dashboards/now/arming.ts";
import { type DarkAsked, goDark } from "../../../dashboards/now/going-dark.ts";
import { aheadFor, forecastOf } from "../../../dashboards/picture/ahead.tsx";
import { eventWord } from "../../../dashboards/picture/events.tsx";
import { cursorSentence } from "../../../dashboards/words/cursor.ts";
import { darkWords } from "../../../dashboards/words/dark.ts";
import { age, amps, ampsAsMeant, keepUnits, power } from "../../../dashboards/words/format.ts";
import { needsOf, promise } from "../../../dashboards/words/needs.ts";
import { pieces } from "../../../dashboards/words/pieces.ts";
import { sentencesOf } from "../../../dashboards/words/state.ts";
import { snapshotOf } from "../../browser/story.ts";

const plain = (text: string): string => text.replaceAll("\u00a0", " ");

describe("values", () => {
  test("read with their unit, a true minus and a no-break space; nothing known is not zero", () => {
    expect(amps(1640)).toBe("1.64\u00a0A");
    expect(amps(-50)).toBe("\u22120.05\u00a0A");
    expect(amps(-0.1)).toBe("0.00\u00a0A");
    expect(amps(null)).toBe("not known");
    expect(plain(power(322.4))).toBe("322 mW");
    expect(plain(power(1420))).toBe("1.42 W");
    expect([119_999, 120_000, 7_200_000].map(age).map(plain)).toEqual(["119 s", "2 min", "2 h"]);
    expect(keepUnits("1.64 A in 13 min at 1064 nm, 4 Apr")).toBe(
      "1.64\u00a0A in 13\u00a0min at 1064\u00a0nm, 4 Apr",
    );
  });
});

describe("the state sentence in pieces", () => {
  const sentence =
    "north is emitting 1.61 A, held down from 1.80 A by its ceiling. The ceiling falls; threshold 0.91 A.";
  const cut = pieces(sentence, { current: "1.61\u00a0A", cause: "" });

  test("joined together is the sentence again", () => {
    expect(plain(cut.map((p) => p.text).join(""))).toBe(sentence);
  });

  test("each word carries its specimen once, and what is abnormal is marked", () => {
    expect(cut.filter((p) => p.kind !== "plain").map((p) => [p.kind, plain(p.text)])).toEqual([
      ["current", "1.61 A"],
      ["warn", "held down from 1.80 A"],
      ["ceiling", "ceiling"],
      ["floor", "threshold"],
    ]);
  });

  test("a longer number is not taken for the current, and a cause is no pattern", () => {
    const other = pieces("11.61 A flows (see a.b)", { current: "1.61\u00a0A", cause: "a.b" });
    expect(other.map((p) => p.kind)).toEqual(["plain", "trip", "plain"]);
    expect(pieces("axb", { current: "", cause: "a.b" }).map((p) => p.kind)).toEqual(["plain"]);
  });
});

describe("a typed current", () => {
  test.each([
    ["1.75", 1750],
    ["1,75", 1750],
    [" 1.75 A ", 1750],
    ["1750 mA", 1750],
    [".5", 500],
    ["0", 0],
  ])("%s is %i mA", (text, current_mA) => {
    expect(typedCurrent(text)).toBe(current_mA);
  });

  test.each(["", "x", "1.7.5", "-1", "1e3", "1 V", "1.75 kA", "1234567890123"])(
    "%s is none",
    (text) => {
      expect(typedCurrent(text)).toBeUndefined();
    },
  );

  test("is read back with its room, and repeated with every digit that was meant", () => {
    const now = snapshotOf("standby", 0);
    const meant = readBack("1.755", now);
    expect(meant).toMatchObject({ kind: "meant", current_mA: 1755 });
    expect(plain(meant.kind === "meant" ? meant.words : "")).toMatch(
      /^I mean 1\.755 A, 0\.1[45] A under the ceiling\..*eyewear\.$/,
    );
    expect(plain(ampsAsMeant(1755))).toBe("1.755 A");
  });

  test("above the ceiling is refused with the highest allowed, rounded down", () => {
    const now = { ...snapshotOf("standby", 0), ceiling_mA: 1698.7 };
    const refused = readBack("1.92", now);
    expect(refused.kind).toBe("refused");
    expect(plain(refused.kind === "refused" ? refused.words : "")).toBe(
      "1.92 A is above the ceiling, 1.70 A just now. Type 1.69 A or less.",
    );
    expect(readBack("1.69", now).kind).toBe("meant");
    expect(readBack("1.70", now).kind).toBe("refused");
  });

  test("without a ceiling nothing is allowed; zero and nonsense are told apart", () => {
    const now = { ...snapshotOf("standby", 0), ceiling_mA: null };
    expect(readBack("0.1", now)).toMatchObject({ kind: "refused" });
    expect(readBack("0", snapshotOf("standby", 0))).toMatchObject({ kind: "refused" });
    expect(readBack("lots", snapshotOf("standby", 0))).toMatchObject({ kind: "refused" });
    expect(readBack("  ", now)).toEqual({ kind: "nothing" });
  });

  test("below threshold it says that no laser light comes of it", () => {
    const meant = readBack("0.5", snapshotOf("standby", 0));
    expect(meant.kind === "meant" ? meant.words : "").toContain("below threshold");
  });
});

describe("going dark", () => {
  const answerOf = (ok: boolean): Response => Response.json({ ok, words: ok ? "Dark." : "No." });
  const ways = { desk: "/api/dark", port: "http://127.0.0.1:1/dark" };

  test("both ways are fired before either answers", async () => {
    const fired: string[] = [];
    let release: (r: Response) => void = () => {};
    const gate = new Promise<Response>((resolve) => {
      release = resolve;
    });
    const done = goDark(
      ways,
      (address) => {
        fired.push(address);
        return gate.then((r) => r.clone());
      },
      () => 0,
      () => {},
    );
    expect(fired.sort()).toEqual(["/api/dark", "http://127.0.0.1:1/dark"]);
    release(answerOf(true));
    expect(await done).toMatchObject({ desk: { is: "dark" }, port: { is: "dark" } });
  });

  test("one way that fails does not hide the other", async () => {
    const told: DarkAsked[] = [];
    const end = await goDark(
      ways,
      async (address) => {
        if (address === ways.desk) throw new Error("gone");
        return answerOf(true);
      },
      () => 1000,
      (state) => told.push(state),
    );
    expect(end.desk.is).toBe("silent");
    expect(end.port.is).toBe("dark");
    expect(darkWords(end).block).toMatch(/^second way said so, \d\d:\d\d:\d\d$/);
    expect(told[0]).toMatchObject({ desk: { is: "asked" }, port: { is: "asked" } });
  });

  test("nobody's answer sends people to the bench; a refusal is told with its words", async () => {
    const silent = await goDark(
      ways,
      () => Promise.reject(new Error("x")),
      () => 0,
      () => {},
    );
    expect(darkWords(silent).sentence).toContain("cut the power at the bench");
    const refused = await goDark(
      ways,
      async () => answerOf(false),
      () => 0,
      () => {},
    );
    expect(darkWords(refused).sentence).toContain("the switch refused");
    const alone = await goDark(
      { ...ways, port: "" },
      async () => answerOf(true),
      () => 0,
      () => {},
    );
    expect(darkWords(alone).block).toMatch(/^switch said so/);
  });
});

describe("what needs somebody", () => {
  test("a trip comes first and carries the reset that names it", () => {
    const now = {
      ...snapshotOf("tripped", 1e9),
      warnings: [{ hazard: "key", words: "the key is off", since: 1e9 }],
    };
    const needs = needsOf(now, 3000);
    expect(needs.map((n) => n.weight)).toEqual(["trip", "warn", "warn"]);
    expect(needs[0]?.verb).toEqual({
      text: "Reset, naming: the interlock loop opened",
      cause: "loop-open",
    });
    expect(needs[1]?.words).toContain("hears nothing");
    expect(needs[2]?.words).toContain("The key is off.");
  });

  test("a calm bench needs nobody", () => {
    expect(needsOf(snapshotOf("calm", 0), 0)).toEqual([]);
  });

  test("the promise is the term and the fall time; a watched bench promises nothing", () => {
    expect(plain(promise(snapshotOf("calm", 0)).join(" "))).toContain("dark within 0.51 s");
    const enforced = "It is only watched; nothing here cuts its light.";
    const watched = { ...snapshotOf("calm", 0), enforcement: "none" as const, enforced };
    expect(promise(watched)).toEqual([enforced]);
  });
});

const heard = { silence_ms: 0, signedOut: false, dark_at: undefined };

describe("sentences", () => {
  test("a silent lit bench is not called dark, a stale page says its age", () => {
    const said = sentencesOf(snapshotOf("calm", 0), { ...heard, silence_ms: 34_000 });
    expect(plain(said.state)).toMatch(/^Nothing heard from north for 34 s\. It last said 1\.45 A/);
    expect(said.state).toContain("whether it is dark is not known here");
  });

  test("a silent bench that takes no permits is not said to end by itself", () => {
    const watched = { ...snapshotOf("calm", 0), enforcement: "none" as const };
    const said = sentencesOf(watched, { ...heard, silence_ms: 34_000 });
    expect(said.state).not.toContain("permits end");
  });

  test("a dark confirmed since then is said, one from before is not", () => {
    const now = snapshotOf("calm", 1_000_000);
    const said = (dark_at: number): string =>
      sentencesOf(now, { ...heard, silence_ms: 5000, dark_at }).state;
    expect(said(1_000_500)).toMatch(/Dark was confirmed at \d\d:\d\d:\d\d\.$/);
    expect(said(900_000)).toContain("is not known here");
  });

  test("the corridor is added where the daemon's sentence lacks it", () => {
    const said = sentencesOf(snapshotOf("calm", 0), heard);
    expect(plain(said.state)).toMatch(
      /The ceiling is 0\.\d\d A above, threshold 0\.\d\d A below\.$/,
    );
  });

  test("the cursor reads one moment as a sentence, and a gap as unknown", () => {
    const row = {
      t: Date.UTC(2026, 11, 1, 22, 46, 8),
      current: 1640,
      ceiling: 1690,
      floor: 850,
      maker: 0,
      asked: 1640,
      output: 322,
      expected: 320,
      degC: 37.8,
      state: 3,
    };
    expect(plain(cursorSentence(row))).toMatch(
      /^\d\d:46:08: 1\.64 A, ceiling 1\.69 A by derating, threshold 0\.85 A; 322 mW; case 37\.8 °C\.$/,
    );
    expect(cursorSentence({ ...row, current: Number.NaN, degC: Number.NaN })).toContain("nothing");
  });

  test("events have a word each, or none where the mark is enough", () => {
    const of = (kind: string, words = "", hazard = ""): string =>
      plain(eventWord({ kind, words, hazard }));
    expect(of("set", "1.64 A is asked now.")).toBe("1.64 A set");
    expect(of("warning", "", "output-low")).toBe("output low");
    expect(of("trip")).toBe("trip");
    expect(of("record")).toBe("");
  });
});

describe("the forecast", () => {
  const empty = { t: [], ceiling: [] } as unknown as Parameters<typeof forecastOf>[0];
  test("is the daemon's time to the cap, or nothing", () => {
    expect(forecastOf(empty, snapshotOf("near", 0))).toEqual({ kind: "cap", in_min: 13 });
    expect(forecastOf(empty, snapshotOf("calm", 0))).toEqual({ kind: "none" });
  });

  test("reaches as far as the past's scale and the expected moment ask, 24 min at most", () => {
    expect(aheadFor(5, { kind: "none" })).toBe(3);
    expect(aheadFor(40, { kind: "still" })).toBe(24);
    expect(aheadFor(5, { kind: "cap", in_min: 8 })).toBe(12);
    expect(aheadFor(5, { kind: "cap", in_min: 500 })).toBe(24);
  });

  test("a ceiling that held still for minutes is drawn on, one that moves is not", () => {
    const now = { ...snapshotOf("calm", 600_000), ceiling_mA: 1780 };
    const past = (ceiling: number) =>
      ({ t: [450_000], ceiling: [ceiling] }) as unknown as Parameters<typeof forecastOf>[0];
    expect(forecastOf(past(1781), now)).toEqual({ kind: "still" });
    expect(forecastOf(past(1800), now)).toEqual({ kind: "none" });
  });
});
