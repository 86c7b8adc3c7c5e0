import { SerialPort } from "serialport";
import { afterEach, describe, expect, test } from "vitest";
import { seal } from "../../firmware-protocol/line.ts";
import { type PtyBoard, startPtyBoard } from "./pty-board.ts";

const ANSWER_ms = 5000;

let board: PtyBoard | null = null;
let port: SerialPort | null = null;

afterEach(async () => {
  const open = port;
  if (open?.isOpen) await new Promise((resolve) => open.close(resolve));
  board?.stop();
});

/** Resolves with all text received once `wanted` stands in it; rejects after five seconds. */
const heard = (from: SerialPort, wanted: RegExp): Promise<string> =>
  new Promise((resolve, reject) => {
    let text = "";
    const giveUp = setTimeout(
      () => reject(new Error(`${wanted} did not come; heard: ${text.slice(-300)}`)),
      ANSWER_ms,
    );
    const onData = (bytes: Buffer): void => {
      text += bytes.toString("latin1");
      if (!wanted.test(text)) return;
      clearTimeout(giveUp);
      from.off("data", onData);
      resolve(text);
    };
    from.on("data", onData);
  });

const opened = async (path: string): Promise<SerialPort> => {
  const fresh = new SerialPort({ path, baudRate: 115_200, autoOpen: false });
  await new Promise<void>((resolve, reject) => {
    fresh.open((error) => (error === null ? resolve() : reject(error)));
  });
  return fresh;
};

describe("the simulated board on a pseudo-terminal (smoke)", () => {
  test("introduces itself, sends samples, and can be opened again", async () => {
    board = await startPtyBoard();
    for (const _time of ["first", "second"]) {
      port = await opened(board.path);
      const introduced = heard(port, /<end \d+ [0-9A-F]{8} [0-9A-F]{4}\n/);
      port.write(`${seal(">who 1")}\n`);
      expect(await introduced).toContain("<hello 1 bs-atmega328p-1 ");
      await heard(port, /<sample .*\n/);
      const closing = port;
      await new Promise((resolve) => closing.close(resolve));
    }
    const state = await board.state();
    expect(state.emitting).toBe(false);
    expect(state.case_degC).toBeLessThan(26);
  });
});
