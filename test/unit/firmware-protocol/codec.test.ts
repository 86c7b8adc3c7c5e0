import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { newSample } from "../../../daemon/model/sample.ts";
import { armAnswerText, curveCrc } from "../../../firmware-protocol/answer.ts";
import { checkLine, LINE_BYTES_MAX, looksDark, seal } from "../../../firmware-protocol/line.ts";
import { readManifest } from "../../../firmware-protocol/manifest.ts";
import { readLine } from "../../../firmware-protocol/messages.ts";
import { encodeArm, encodePermit } from "../../../firmware-protocol/permit.ts";
import { decodeSampleInto, readSample, sampleGroups } from "../../../firmware-protocol/sample.ts";
import { INTRODUCTION } from "./introduction.ts";
import { secondJudge } from "./second-judge.ts";

const SEED = 20261201;
const manifestResult = readManifest(INTRODUCTION);
if (manifestResult.kind !== "manifest") throw new Error(manifestResult.problems.join("; "));
const groups = sampleGroups(manifestResult.manifest);

const u32 = fc.integer({ min: 0, max: 0xffffffff });
const u16 = fc.integer({ min: 0, max: 0xffff });
const session = fc
  .integer({ min: 1, max: 0xffffffff })
  .map((n) => n.toString(16).toUpperCase().padStart(8, "0"));
const permit = fc
  .tuple(session, u32, u16, u16, u16)
  .map(([s, n, a, b, term]) => ({ s, n, cap: Math.max(a, b), aim: Math.min(a, b), term }));
const sampleBody = fc
  .tuple(
    u32,
    u32,
    u16,
    fc.nat(255),
    fc.option(u32),
    fc.option(u16),
    u16,
    fc.constantFrom(0, 1),
    fc.array(fc.integer({ min: -999, max: 999_999 }), { minLength: 6, maxLength: 6 }),
  )
  .map(([seq, tick, status, cause, ack, age, conv, group, v]) => {
    const values = group === 0 ? v.slice(0, 4) : v;
    const bits = status.toString(16).toUpperCase().padStart(4, "0");
    return `<sample ${seq} ${tick} ${bits} ${cause} ${ack ?? "-"} ${age ?? "-"} ${conv} ${group} ${values.join(" ")}`;
  });

describe(`codec properties (seed ${SEED})`, () => {
  const run = { seed: SEED, numRuns: 400 };

  test("a permit reads back as it was written", () => {
    fc.assert(
      fc.property(permit, ({ s, n, cap, aim, term }) => {
        const judged = readLine(encodePermit(s, n, cap, aim, term), "controller");
        expect(judged).toEqual({
          kind: "message",
          verb: "permit",
          fields: { session: s, n, cap, aim, term, dither: null },
        });
      }),
      run,
    );
  });

  test("any one byte of a permit changed is broken or dark, never another permit", () => {
    fc.assert(
      fc.property(permit, fc.nat(), fc.integer({ min: 1, max: 255 }), (p, place, flip) => {
        const line = encodePermit(p.s, p.n, p.cap, p.aim, p.term);
        const at = place % line.length;
        const code = line.charCodeAt(at) ^ flip;
        const bad = line.slice(0, at) + String.fromCharCode(code) + line.slice(at + 1);
        const judged = readLine(bad, "controller");
        expect(judged.kind).not.toBe("message");
      }),
      run,
    );
  });

  test("bursts of up to 16 bits in a permit are all found", () => {
    fc.assert(
      fc.property(permit, fc.nat(), fc.integer({ min: 1, max: 0xffff }), (p, place, burst) => {
        const line = encodePermit(p.s, p.n, p.cap, p.aim, p.term);
        const at = place % (line.length - 1);
        const bad =
          line.slice(0, at) +
          String.fromCharCode(line.charCodeAt(at) ^ (burst >> 8)) +
          String.fromCharCode(line.charCodeAt(at + 1) ^ (burst & 255)) +
          line.slice(at + 2);
        expect(readLine(bad, "controller").kind).not.toBe("message");
      }),
      run,
    );
  });

  test("a sample decodes by hand as it does by the table", () => {
    fc.assert(
      fc.property(sampleBody, (body) => {
        const sample = newSample();
        expect(decodeSampleInto(seal(body), groups, sample)).toBeNull();
        const plain = readSample(body.split(" ").slice(1));
        expect(plain).not.toBeNull();
        const channels = groups.channels[plain?.group ?? 0] ?? [];
        expect({
          seq: sample.seq,
          tick: sample.tick,
          status: sample.status,
          cause: sample.cause,
          ack: sample.ackSeq,
          age: sample.ackAge_ticks,
          conv: sample.conversions,
          group: sample.group,
          values: [...channels].map((i) => sample.values[i]),
        }).toEqual(plain);
      }),
      run,
    );
  });

  test("the sample decoder, the table and the second judge agree on damaged bodies", () => {
    const printable = fc.integer({ min: 0x20, max: 0x7e });
    fc.assert(
      fc.property(sampleBody, fc.nat(), printable, (body, place, code) => {
        const at = 8 + (place % (body.length - 8));
        const bad = seal(body.slice(0, at) + String.fromCharCode(code) + body.slice(at + 1));
        const fields = bad.slice(1, -5).split(" ").slice(1);
        const plain = readSample(fields);
        expect(plain === null ? "form" : "ok").toBe(secondJudge(bad, "host"));
        const channels = plain === null ? null : groups.channels[plain.group];
        const fits = channels !== null && channels?.length === plain?.values.length;
        const before = newSample();
        const sample = newSample();
        const broken = decodeSampleInto(bad, groups, sample);
        expect(broken).toBe(fits ? null : "form");
        if (broken !== null) expect(sample).toEqual(before);
      }),
      { seed: SEED, numRuns: 2000 },
    );
  });

  test("both judges agree on noise, on noise closed well, and on damaged lines", () => {
    const noise = fc.string({
      unit: fc.integer({ min: 0, max: 255 }).map((c) => String.fromCharCode(c)),
      maxLength: 30,
    });
    const bodies = fc.oneof(
      noise,
      fc
        .stringMatching(/^[<>](who|dark|reset|permit|yes|no|end|say|stage) [0-9a-fA-F -]{0,20}$/)
        .map(seal),
      fc
        .constantFrom("dark", ">dark 0 ", ">DaRk")
        .chain((head) => noise.map((rest) => head + rest)),
    );
    fc.assert(
      fc.property(bodies, fc.constantFrom("controller" as const, "host" as const), (line, to) => {
        const judged = readLine(line, to);
        const verdict =
          judged.kind === "message" ? "ok" : judged.kind === "dark" ? "dark" : judged.broken;
        expect(verdict).toBe(secondJudge(line, to));
      }),
      { seed: SEED, numRuns: 3000 },
    );
  });
});

describe("what the encoders refuse to make", () => {
  test.each([
    ["no session", () => encodePermit("00000000", 1, 2, 1, 500)],
    ["a session that is no token", () => encodePermit("0badf00d", 1, 2, 1, 500)],
    ["an aim above its cap", () => encodePermit("0BADF00D", 1, 2, 3, 500)],
    ["a fraction", () => encodePermit("0BADF00D", 1, 2.5, 1, 500)],
    ["a cap above u16", () => encodePermit("0BADF00D", 1, 65536, 1, 500)],
    ["a term that is no number", () => encodePermit("0BADF00D", 1, 2, 1, Number.NaN)],
    ["a sample number that wrapped below zero", () => encodePermit("0BADF00D", -1, 2, 1, 500)],
  ])("%s", (_, make) => {
    expect(make).toThrow(RangeError);
  });

  test("a line over 160 bytes, and a line end inside a body", () => {
    expect(seal(`<say ${"y".repeat(150)}`)).toHaveLength(LINE_BYTES_MAX);
    expect(() => seal(`<say ${"y".repeat(151)}`)).toThrow(/161 bytes/);
    expect(() => seal(">who 1\n>who 1")).toThrow(/0xa/);
  });
});

describe("checked by hand", () => {
  // Sums made with Python's binascii.crc_hqx and zlib.crc32.
  test("closing digits", () => {
    expect(seal(">who 1")).toBe(">who 1 90B2");
    expect(encodeArm(0xc2310a37)).toBe(seal(">arm C2310A37"));
  });

  test("the arm answer's text and a curve's sum", () => {
    const terms = {
      number: "1A2B3C4D",
      boot: 8,
      arms: 3,
      curveCrc: "9B6D1F20",
      absolute_counts: 2200,
      term_ticks_min: 150,
      term_ticks_max: 10000,
      protocol: 1,
      firmware: "bs-atmega328p-1",
    };
    expect(armAnswerText(terms)).toBe("1A2B3C4D 8 3 9B6D1F20 2200 150 10000 1 bs-atmega328p-1");
    expect(curveCrc({ x: [100, 900], y: [2000, 0] })).toBe("F1E02E22");
  });

  test("a sample of an undescribed group, a value too few and a value too many are of wrong form", () => {
    const sample = newSample();
    const head = "<sample 1 2 0000 0 - - 1";
    expect(decodeSampleInto(seal(`${head} 2 1 2 3 4`), groups, sample)).toBe("form");
    expect(decodeSampleInto(seal(`${head} 0 1 2 3`), groups, sample)).toBe("form");
    expect(decodeSampleInto(seal(`${head} 0 1 2 3 4 5`), groups, sample)).toBe("form");
    expect(decodeSampleInto(seal(`${head} 0 1 2 3 4`), groups, sample)).toBeNull();
    expect([...sample.fresh.slice(0, 6)]).toEqual([1, 1, 1, 1, 0, 0]);
    expect(decodeSampleInto(seal("<say sample"), groups, sample)).toBe("verb");
  });

  test.each([
    "4294967296 2 0000 0 - - 1 0 1 2 3 4",
    "1 4294967296 0000 0 - - 1 0 1 2 3 4",
    "1 2 0000 256 - - 1 0 1 2 3 4",
    "1 2 0000 0 4294967296 - 1 0 1 2 3 4",
    "1 2 0000 0 - 65536 1 0 1 2 3 4",
    "1 2 0000 0 - - 65536 0 1 2 3 4",
    "1 2 0000 0 - - 1 16 1 2 3 4",
    "1 2 0000 0 - - 1 0 1 2 3 2147483648",
    "1 2 0000 0 - - 1 0 1 2 3 -2147483649",
    "1 2 000 0 - - 1 0 1 2 3 4",
    "1 2 0000 0 - - 1 0 1 2 3 4 ",
    "1 2 0000 0 - - 1 0 1 2 3 ",
    "1 2 0000 0 - - 1 0 1 2 3 -",
    "1 2 0000 0 - - 1 0 1 2 3 -0",
    "01 2 0000 0 - - 1 0 1 2 3 4",
  ])("just outside its kind, a sample is of wrong form: %s", (fields) => {
    expect(decodeSampleInto(seal(`<sample ${fields}`), groups, newSample())).toBe("form");
  });

  test("the largest and smallest of every kind are read", () => {
    const sample = newSample();
    const line = seal(
      "<sample 4294967295 4294967295 FFFF 255 4294967295 65535 65535 0 2147483647 -2147483648 0 -1",
    );
    expect(decodeSampleInto(line, groups, sample)).toBeNull();
    expect([sample.seq, sample.ackSeq, sample.ackAge_ticks]).toEqual([
      4294967295, 4294967295, 65535,
    ]);
    expect([...sample.values.slice(0, 4)]).toEqual([2147483647, -2147483648, 0, -1]);
  });

  test("a slower group refreshes its channels and leaves the others' last values", () => {
    const sample = newSample();
    decodeSampleInto(seal("<sample 1 2 0000 0 - - 1 1 1 2 3 4 70 80"), groups, sample);
    decodeSampleInto(seal("<sample 2 4 0000 0 - - 1 0 5 6 7 8"), groups, sample);
    expect([...sample.values.slice(0, 6)]).toEqual([5, 6, 7, 8, 70, 80]);
    expect([...sample.fresh.slice(0, 6)]).toEqual([1, 1, 1, 1, 0, 0]);
  });

  test("dark is seen however it is written, and not where it is not", () => {
    for (const text of ["dark", ">dark", "DARK", "dArKness", ">dark 0 FFFF"])
      expect(looksDark(text)).toBe(true);
    for (const text of ["dar", ">>dark", "<dark", " dark", "is dark"])
      expect(looksDark(text)).toBe(false);
  });

  test("order of judging: the first kind that fits names the line", () => {
    expect(checkLine("\u00ff".repeat(161), "host")).toBe("long");
    expect(checkLine(">\u00ff", "host")).toBe("char");
    expect(checkLine(">x", "host")).toBe("direction");
    expect(checkLine("<x 0000", "host")).toBe("crc");
  });
});
