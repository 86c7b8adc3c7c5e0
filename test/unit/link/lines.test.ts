import { once } from "node:events";
import { createServer } from "node:net";
import { ReadlineParser } from "@serialport/parser-readline";
import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { BuiltInTransport } from "../../../daemon/link/transports/built-in.ts";
import {
  GuardStream,
  LengthGuard,
  LINE_BYTES_PASSED,
  LineSplitter,
  withoutReturn,
} from "../../../daemon/link/transports/lines.ts";
import { TcpTransport } from "../../../daemon/link/transports/tcp.ts";
import type { BuiltInBench } from "../../../daemon/link/transports/transport.ts";
import { readLine } from "../../../firmware-protocol/messages.ts";

const SEED = 20261201;

/** Cuts bytes at these places, counted from the front of what is left. */
const cut = (bytes: Uint8Array, sizes: readonly number[]): Uint8Array[] => {
  const chunks: Uint8Array[] = [];
  let from = 0;
  for (const size of sizes) {
    if (from >= bytes.length) break;
    chunks.push(bytes.slice(from, from + size));
    from += size;
  }
  if (from < bytes.length) chunks.push(bytes.slice(from));
  return chunks;
};

/** What the lines are, said slowly and by other means than the code under test. */
const linesOf = (bytes: Uint8Array): string[] =>
  Buffer.from(bytes)
    .toString("latin1")
    .split("\n")
    .slice(0, -1)
    .map((line) => line.slice(0, LINE_BYTES_PASSED).replace(/\r$/, ""))
    .filter((line) => line !== "");

const bySplitter = (chunks: readonly Uint8Array[]): string[] => {
  const lines: string[] = [];
  const splitter = new LineSplitter((line) => lines.push(line));
  for (const chunk of chunks) splitter.feed(chunk);
  return lines;
};

/** The serial transport's own chain: guard, then readline parser. */
const byStreams = async (chunks: readonly Uint8Array[]): Promise<string[]> => {
  const lines: string[] = [];
  const guard = new GuardStream();
  const parser = guard.pipe(new ReadlineParser({ delimiter: "\n", encoding: "latin1" }));
  parser.on("data", (text: string) => {
    const line = withoutReturn(text);
    if (line !== "") lines.push(line);
  });
  for (const chunk of chunks) guard.write(chunk);
  // A last line end tells when everything before it has come through.
  guard.end("\n<<end\n");
  await once(parser, "end");
  const rest = lines.lastIndexOf("<<end");
  return lines.slice(0, rest);
};

const byBuiltIn = async (chunks: readonly Uint8Array[]): Promise<string[]> => {
  const lines: string[] = [];
  const bench: BuiltInBench = { write() {}, onBytes() {}, start() {}, stop() {} };
  const transport = new BuiltInTransport(bench);
  await new Promise<void>((opened) => {
    transport.open({ opened, line: (line) => lines.push(line), closed() {} });
  });
  for (const chunk of chunks) bench.onBytes(chunk);
  transport.close();
  return lines;
};

const text = fc.constantFrom(
  "<sample 1 2",
  "\r",
  "\n",
  "\r\n",
  "\n\n",
  "x".repeat(80),
  "y".repeat(170),
  "\u00ff\u0000\u0018",
);
const bytes = fc
  .array(text, { maxLength: 14 })
  .map((parts) => Uint8Array.from(Buffer.from(parts.join(""), "latin1")));
const sizes = fc.array(fc.integer({ min: 1, max: 90 }), { maxLength: 40 });

describe(`lines (seed ${SEED})`, () => {
  test("splitter, guarded readline parser and built-in bench hand over the same lines for any chunking", async () => {
    await fc.assert(
      fc.asyncProperty(bytes, sizes, async (all, places) => {
        // The parser flushes what is left at the end; a live port never ends so, hence the line end.
        const whole = Uint8Array.from([...all, 0x0a]);
        const wanted = linesOf(whole);
        const chunks = cut(whole, places);
        expect(bySplitter(chunks)).toEqual(wanted);
        expect(await byStreams(chunks)).toEqual(wanted);
        expect(await byBuiltIn(chunks)).toEqual(wanted);
      }),
      { seed: SEED, numRuns: 200 },
    );
  });

  test("TCP hands over the same lines, however they were written", async () => {
    const samples = fc.sample(fc.tuple(bytes, sizes), { seed: SEED, numRuns: 12 });
    for (const [all, places] of samples) {
      const whole = Uint8Array.from([...all, 0x0a, ...Buffer.from("<<end\n")]);
      expect(await byTcp(cut(whole, places))).toEqual(linesOf(whole));
    }
  });

  test("an over-long line keeps its head, so that its reader sees it was long", () => {
    for (const length of [160, 161, 162, 163, 5000]) {
      const [line] = bySplitter([Buffer.from(`${"x".repeat(length)}\nafter\n`)]);
      const judged = readLine(line ?? "", "host");
      const wanted = length > 160 ? "long" : "direction";
      expect(judged.kind === "broken" ? judged.broken : "").toBe(wanted);
    }
    expect(bySplitter([Buffer.from(`${"x".repeat(160)}\r\n`)])[0]).toHaveLength(160);
    // A carriage return where the head ends must not make a legal line of an over-long one.
    expect(bySplitter([Buffer.from(`${"x".repeat(160)}\rmore\n`)])[0]).toHaveLength(162);
    expect(bySplitter([Buffer.from(`${"x".repeat(161)}\r\n`)])[0]).toHaveLength(161);
  });

  test("the built-in bench hears the first line written on opening, and none after the end", async () => {
    const heard: string[] = [];
    let running = false;
    const bench: BuiltInBench = {
      write: (chunk) => {
        if (running) heard.push(Buffer.from(chunk).toString("latin1"));
      },
      onBytes() {},
      start: () => {
        running = true;
      },
      stop() {},
    };
    const transport = new BuiltInTransport(bench);
    expect(transport.write("early\n")).toBe(false);
    await new Promise<void>((resolve) => {
      transport.open({
        opened: () => {
          transport.write(">who 1\n");
          resolve();
        },
        line() {},
        closed() {},
      });
    });
    transport.close();
    expect(transport.write("late\n")).toBe(false);
    expect(heard).toEqual([">who 1\n"]);
  });

  test("a flood without a line end takes no memory and is counted", () => {
    const guard = new LengthGuard();
    const chunk = new Uint8Array(65_536).fill(0x41);
    let passed = 0;
    for (let i = 0; i < 160; i += 1) passed += guard.pass(chunk).length;
    expect(passed).toBe(LINE_BYTES_PASSED);
    expect(guard.dropped).toBe(160 * 65_536 - LINE_BYTES_PASSED);
  });

  test("a chunk that fits is passed as it is", () => {
    const chunk = new Uint8Array(100).fill(0x41);
    expect(new LengthGuard().pass(chunk)).toBe(chunk);
  });
});

const byTcp = async (chunks: readonly Uint8Array[]): Promise<string[]> => {
  const server = createServer((socket) => {
    for (const chunk of chunks) socket.write(chunk);
  });
  server.listen(0, "127.0.0.1");
  await once(server, "listening");
  const address = server.address();
  const port = typeof address === "object" && address !== null ? address.port : 0;
  const transport = new TcpTransport({ host: "127.0.0.1", port });
  const lines: string[] = [];
  await new Promise<void>((resolve, reject) => {
    transport.open({
      opened() {},
      line: (line) => {
        lines.push(line);
        if (line === "<<end") resolve();
      },
      closed: (why) => reject(new Error(why)),
    });
  });
  transport.close();
  server.close();
  await once(server, "close");
  return lines;
};
